import { dirname, join } from 'node:path';
import { nameOf, printableName, sidecarNameOf } from '../acquisition/file-name.ts';
import { putBackHeld } from '../acquisition/filing.ts';
import { contentSha256, exists } from '../acquisition/filing-disk.ts';
import { placesFor } from '../acquisition/filing-place.ts';
import { nothingSaid } from '../config/sample-layout.ts';
import type { WorkerPool } from '../manipulation/pool.ts';
import { writeMark } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Taken } from './batches.ts';
import { keyOf, missingOf } from './beyond-ledger.ts';
import { type FiledLine, type FilingLog, filingsMark } from './filing-log.ts';
import type { Logger } from './log.ts';
import type { HeaderAnswer, RecordingAnswer, RecordingTask } from './recording-task.ts';
import { startsOf } from './recording-time.ts';
import type { SiteView } from './site-view.ts';
import type { TakeFiles } from './take-files.ts';
import type { ReadyRecording } from './verdicts.ts';

/**
 * Closes the gap of a ledger that was put back from a backup: recordings that were filed since then are taken again
 * from where they lie, with their first time of arrival and in the order of their first decisions, so that the same
 * is decided. They are a backlog: what came and went is told in one mail, what stands is mailed. Nothing newer is taken before.
 */
export interface TakeArchivedTools {
  readonly ledger: Ledger;
  readonly view: () => SiteView;
  readonly pool: WorkerPool<RecordingTask, RecordingAnswer>;
  readonly log: Logger;
  readonly take: TakeFiles;
  readonly filingLog: FilingLog;
  readonly missing: readonly FiledLine[];
}

/** Files that came within this time of one another were taken together. */
const togetherMs = 60_000;
const lookedAtOnce = 32;
/** A reload in between lets go of what was under way; the second look finds it. */
const mostLooks = 2;

export class TakeArchived {
  readonly #tools: TakeArchivedTools;
  #missing: readonly FiledLine[];
  #looks = 0;
  /** The time of the round was up: to be called again at once, not after a while. */
  isLetUp = false;
  readonly #leftOut = new Set<string>();

  constructor(tools: TakeArchivedTools) {
    this.#tools = tools;
    this.#missing = tools.missing;
    if (tools.missing.length === 0) tools.filingLog.settled = true;
  }

  get isOpen(): boolean {
    return !this.#tools.filingLog.settled;
  }

  /** How many are in the ledger again. Throws LedgerError where it cannot be written; to be called again then. */
  async all(): Promise<number> {
    const { ledger, log, filingLog } = this.#tools;
    let taken = 0;
    this.isLetUp = false;
    while (this.#missing.length > 0 && this.#looks < mostLooks) {
      for (const group of together(this.#missing)) {
        const { decided, left, notBegun } = await this.#group(group);
        taken += decided;
        this.isLetUp = left === 0 && notBegun.length > 0;
        if (left + notBegun.length > 0) return taken;
      }
      this.#looks++;
      const rest = await missingOf(ledger, this.#missing);
      if (rest.length === this.#missing.length) break;
      this.#missing = rest;
    }
    const { mark } = filingLog;
    if (mark !== null) await ledger.transact((writer) => writeMark(writer, filingsMark, mark));
    filingLog.settled = true;
    if (taken > 0)
      log.warn({ taken, left_out: this.#leftOut.size }, 'taken again from the archive: the ledger was older');
    return taken;
  }

  async #group(group: readonly FiledLine[]): Promise<Taken> {
    const still = (await missingOf(this.#tools.ledger, group)).filter(
      (line) => !this.#leftOut.has(keyOf(line)),
    );
    const ready: ReadyRecording[] = [];
    for (let n = 0; n < still.length; n += lookedAtOnce) {
      const looked = await Promise.all(still.slice(n, n + lookedAtOnce).map((line) => this.#ready(line)));
      ready.push(...looked.filter((one) => one !== null));
    }
    const starts = startsOf(this.#tools.view(), ready);
    return this.#tools.take.recordings(ready, (one) => starts.get(one) as number);
  }

  /** Null: nothing of it can be taken again, and that is said. */
  async #ready(line: FiledLine): Promise<ReadyRecording | null> {
    const view = this.#tools.view();
    const { drop, data } = view.site.folders;
    // It was being filed when the old ledger ended: with its name back it is an arrival like any other.
    if (await putBackHeld(drop, line)) return null;
    if (line.outcome !== 'taken' && line.outcome !== 'repeat') return null;
    const archived = line.to === null ? null : await placeOf(data, line.to, line.sha256);
    if (archived === null) return this.#leave(line, 'it lies no longer in the archive');
    const points = view.files.pointsFor(line.from);
    if (points.length === 0) return this.#leave(line, 'no point of the site file takes its name');
    const beside = join(dirname(archived), sidecarNameOf(nameOf(archived)));
    const answer = await this.#tools.pool.run({
      task: 'header',
      path: join(data, archived),
      sidecarPath: line.sidecarSha256 === null ? null : join(data, beside),
      largestBytes: view.site.largestFileBytes,
      layout: points[0]?.recordings.layout ?? nothingSaid,
    });
    const header = answer.outcome === 'answer' ? (answer.answer as HeaderAnswer) : null;
    if (header?.kind !== 'header') return this.#leave(line, `${archived} cannot be read`);
    const source = view.files.sourceOf(line.from) ?? line.from;
    const { from: path, arrivedMs } = line;
    return {
      path,
      sidecarPath: null,
      header,
      points,
      source,
      arrivedMs,
      zeroTail: header.zeroTail,
      view,
      archived,
    };
  }

  #leave(line: FiledLine, why: string): null {
    this.#leftOut.add(keyOf(line));
    this.#tools.log.warn({ file: printableName(line.from) }, `not taken again: ${why}`);
    return null;
  }
}

/** Where a file went in the end: the first of its places that holds its content. */
async function placeOf(dataFolder: string, to: string, sha256: string): Promise<string | null> {
  for (const place of placesFor(to, sha256)) {
    const path = Buffer.from(join(dataFolder, place));
    if ((await exists(path)) && (await contentSha256(path)) === sha256) return place;
  }
  return null;
}

function* together(lines: readonly FiledLine[]): Generator<readonly FiledLine[]> {
  let group: FiledLine[] = [];
  for (const line of lines) {
    const last = group.at(-1);
    if (last !== undefined && Math.abs(line.arrivedMs - last.arrivedMs) > togetherMs) {
      yield group;
      group = [];
    }
    group.push(line);
  }
  if (group.length > 0) yield group;
}
