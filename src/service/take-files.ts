import { printableName } from '../acquisition/file-name.ts';
import { pointPath } from '../config/site.ts';
import type { WorkerPool } from '../manipulation/pool.ts';
import { beginAttempt, endAttempt, unfinishedAttempts } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';
import { LedgerError } from '../store/ledger-error.ts';
import { absolutePath, type GivenUp, type ReadyRecording, type Unassigned } from './arrivals.ts';
import type { Clock } from './clock.ts';
import { decide } from './decide.ts';
import type { FileAway } from './file-away.ts';
import type { FileLook } from './file-source.ts';
import type { KeptFiles } from './kept-files.ts';
import type { Complaints, Logger } from './log.ts';
import type { HashAnswer, MeasureAnswer, RecordingAnswer, RecordingTask } from './recording-task.ts';
import { type AsideFile, decideAside } from './set-aside.ts';
import type { SiteView } from './site-view.ts';
import type { Step } from './steps.ts';

/** Analysis in parallel, decisions one after another. */
export interface TakeTools {
  readonly ledger: Ledger;
  readonly clock: Clock;
  readonly view: () => SiteView;
  readonly pool: WorkerPool<RecordingTask, RecordingAnswer>;
  readonly fileAway: FileAway;
  readonly forget: (path: string) => void;
  readonly log: Logger;
  readonly complaints: Complaints;
  readonly step: Step;
  readonly kept: KeptFiles;
}

/** Files of a batch, a worker; two batches are under way at a time. */
const waitingPerWorker = 2;

type Analysed = {
  readonly ready: ReadyRecording;
  readonly answer: MeasureAnswer | { readonly kind: 'stopped'; readonly reason: string };
};

export class TakeFiles {
  readonly #tools: TakeTools;
  /** Files whose analysis was begun in an earlier run and not ended: they may have stopped it. */
  #suspects: Map<string, number> | null = null;

  constructor(tools: TakeTools) {
    this.#tools = tools;
  }

  /** Takes recordings in their order. `left`: files that stay in the drop folder for now. */
  async recordings(
    ready: readonly ReadyRecording[],
    startOf: (ready: ReadyRecording) => number,
  ): Promise<{ readonly decided: number; readonly left: number }> {
    if (ready.length === 0) return { decided: 0, left: 0 };
    const suspects = await this.#suspectsOf();
    const newest = newestBySource(ready, startOf);
    let decided = 0;
    const held = new Set<string>();
    const waiting = [...batches(ready, suspects, this.#tools.pool.threads * waitingPerWorker)];
    let next = await this.#start(waiting.shift());
    while (next !== null) {
      const now = next;
      // The next batch is analysed while this one is decided; a file that stopped the service is read alone.
      const ahead = waiting[0];
      const apart = ahead === undefined || isSuspect(ahead[0], suspects) || isSuspect(now.files[0], suspects);
      next = apart ? null : await this.#start(waiting.shift());
      for (const group of sameStart(now.files, startOf)) {
        const analysed = await Promise.all(group.map((index) => now.running[index] as Promise<Analysed>));
        for (const one of analysed.sort(byHash)) {
          if (one.ready.points.some((point) => held.has(pointPath(point)))) continue;
          if (await this.#decide(one, newest.get(one.ready.source) as number)) decided++;
          else for (const point of one.ready.points) held.add(pointPath(point));
        }
      }
      next ??= await this.#start(waiting.shift());
    }
    return { decided, left: held.size === 0 ? 0 : ready.length - decided };
  }

  /** Notes the attempts of a batch and sets its analysis going. */
  async #start(batch: readonly ReadyRecording[] | undefined) {
    if (batch === undefined) return null;
    const files = await this.#begin(batch);
    return { files, running: files.map((one) => this.#analyse(one)) };
  }

  async givenUp(files: readonly GivenUp[]): Promise<number> {
    let done = 0;
    for (const file of files) {
      const trouble = file.kind === 'late-sidecar' ? 'late-sidecar' : 'unreadable';
      if (await this.#setAside({ ...file, outcome: 'quarantined', trouble })) done++;
    }
    return done;
  }

  async unassigned(files: readonly Unassigned[]): Promise<number> {
    let done = 0;
    for (const { path, arrivedMs } of files) {
      const reason = 'no point of the site file takes a file of this name';
      const aside = {
        path,
        sidecarPath: null,
        source: null,
        arrivedMs,
        reason,
        outcome: 'unassigned',
        trouble: 'unassigned',
      } as const;
      if (await this.#setAside(aside)) done++;
    }
    return done;
  }

  async #suspectsOf(): Promise<ReadonlyMap<string, number>> {
    if (this.#suspects === null) {
      const attempts = await this.#tools.ledger.read((reader) => unfinishedAttempts(reader));
      this.#suspects = new Map(attempts.map(({ fileKey, unfinished }) => [fileKey, unfinished]));
    }
    return this.#suspects;
  }

  /** Notes the attempts; a file that stopped the service twice is not tried a third time. */
  async #begin(files: readonly ReadyRecording[]): Promise<ReadyRecording[]> {
    const { ledger, clock, step } = this.#tools;
    const suspects = await this.#suspectsOf();
    const poison = files.filter((file) => (suspects.get(keyOf(file.header.look)) ?? 0) >= 2);
    for (const { path, sidecarPath, source, arrivedMs } of poison) {
      const reason = `${printableName(path)}: stopped the service twice while it was read`;
      await this.#setAside({
        path,
        sidecarPath,
        source,
        arrivedMs,
        reason,
        outcome: 'quarantined',
        trouble: 'unreadable',
      });
    }
    const good = files.filter((file) => !poison.includes(file));
    if (good.length === 0) return [];
    const begunMs = Math.round(clock.wallMs());
    await ledger.transact(async (writer) => {
      for (const { path, header } of good)
        await beginAttempt(writer, { fileKey: keyOf(header.look), fileName: path, begunMs });
    });
    step('intake: attempt noted');
    return good;
  }

  async #analyse(ready: ReadyRecording): Promise<Analysed> {
    const view = this.#tools.view();
    const answer = await this.#tools.pool.run({
      task: 'measure',
      path: `${view.site.folders.drop}/${ready.path}`,
      largestBytes: view.site.largestFileBytes,
      seen: ready.header.look,
      sidecar: ready.header.sidecar,
      points: ready.points.map((point) => ({
        point,
        nominalHz: view.machine(point.machineId).runningSpeedHz,
      })),
    });
    if (answer.outcome === 'answer') return { ready, answer: answer.answer as MeasureAnswer };
    if (answer.outcome === 'refused') return { ready, answer: { kind: 'stopped', reason: answer.reason } };
    throw new Error(answer.reason);
  }

  /** False: the file stays where it is, to be tried again. */
  async #decide({ ready, answer }: Analysed, batchNewestStatedMs: number): Promise<boolean> {
    const { ledger, clock, view, fileAway, forget, complaints, step, log } = this.#tools;
    step('intake: recording read');
    const fileKey = keyOf(ready.header.look);
    const { path, sidecarPath, source, arrivedMs } = ready;
    try {
      if (answer.kind === 'changed' || answer.kind === 'gone') {
        await ledger.transact((writer) => endAttempt(writer, fileKey));
        forget(path);
        return true;
      }
      if (answer.kind !== 'measured') {
        const why =
          answer.kind === 'refused' ? answer.refusal.reason : `reading it stopped a worker: ${answer.reason}`;
        const reason = `${printableName(path)}: ${why}`;
        return await this.#setAside({
          path,
          sidecarPath,
          source,
          arrivedMs,
          reason,
          outcome: 'quarantined',
          trouble: 'unreadable',
        });
      }
      step('intake: decision begun');
      const now = view();
      const wallMs = Math.round(clock.wallMs());
      const decided = await ledger.transact((writer) =>
        decide(writer, now, { ready, answer, fileKey, batchNewestStatedMs }, wallMs),
      );
      if (now.site.folders.afterReading === 'keep') this.#tools.kept.add({ path, ...answer.look });
      const { sidecar } = ready.header;
      fileAway.know(decided.recordingId, {
        file: answer.look,
        sidecar:
          sidecar === null || sidecarPath === null
            ? null
            : { path: sidecarPath, sha256: sidecar.sha256, look: sidecar.look },
      });
      step('intake: decision committed');
      log.debug({ file: path, outcome: decided.outcome }, 'recording in the ledger');
      complaints.over('ledger');
      return true;
    } catch (error) {
      if (!(error instanceof LedgerError)) throw error;
      complaints.say('ledger', `${error.message}; ${printableName(path)} stays in the drop folder`);
      return false;
    }
  }

  async #setAside(
    file: Omit<AsideFile, 'look' | 'sha256' | 'sidecarSha256' | 'fileKey'> & {
      readonly sidecarPath: string | null;
    },
  ): Promise<boolean> {
    const { ledger, clock, view, fileAway, log, step } = this.#tools;
    const hashed = await this.#hash(file.path);
    if (hashed === null) return false;
    const beside = file.sidecarPath === null ? null : await this.#hash(file.sidecarPath);
    const wallMs = Math.round(clock.wallMs());
    const aside: AsideFile = {
      ...file,
      look: hashed.look,
      sha256: hashed.sha256,
      sidecarSha256: beside?.sha256 ?? null,
      fileKey: keyOf(hashed.look),
    };
    const recordingId = await ledger.transact((writer) => decideAside(writer, view(), aside, wallMs));
    fileAway.know(recordingId, {
      file: hashed.look,
      sidecar: beside === null || file.sidecarPath === null ? null : { path: file.sidecarPath, ...beside },
    });
    step('intake: decision committed');
    log.warn({ file: printableName(file.path) }, `${file.outcome}: ${file.reason}`);
    return true;
  }

  /** Null: gone, or not to be touched. */
  async #hash(path: string): Promise<{ readonly look: FileLook; readonly sha256: string } | null> {
    const { site } = this.#tools.view();
    const answer = await this.#tools.pool.run({
      task: 'hash',
      path: absolutePath(site.folders.drop, path),
      largestBytes: Number.MAX_SAFE_INTEGER,
    });
    if (answer.outcome !== 'answer') return null;
    const hashed = answer.answer as HashAnswer;
    return hashed.kind === 'hashed' ? hashed : null;
  }
}

function isSuspect(ready: ReadyRecording | undefined, suspects: ReadonlyMap<string, number>): boolean {
  return ready !== undefined && suspects.has(keyOf(ready.header.look));
}

function keyOf(look: FileLook): string {
  return `${look.dev}:${look.ino}:${look.size}:${look.mtimeMs}`;
}

/** Suspects travel alone, the others in batches of what may wait. */
function* batches(
  ready: readonly ReadyRecording[],
  suspects: ReadonlyMap<string, number>,
  most: number,
): Generator<readonly ReadyRecording[]> {
  let batch: ReadyRecording[] = [];
  for (const one of ready) {
    const alone = isSuspect(one, suspects);
    if (batch.length > 0 && (alone || batch.length >= most)) {
      yield batch;
      batch = [];
    }
    batch.push(one);
    if (alone) {
      yield batch;
      batch = [];
    }
  }
  if (batch.length > 0) yield batch;
}

/** Indices of neighbours with the same start and source; among them the hash decides. */
function sameStart(ready: readonly ReadyRecording[], startOf: (ready: ReadyRecording) => number): number[][] {
  const groups: number[][] = [];
  for (const [index, one] of ready.entries()) {
    const last = groups.at(-1);
    const before = last === undefined ? undefined : (ready[last[0] as number] as ReadyRecording);
    if (before !== undefined && before.source === one.source && startOf(before) === startOf(one))
      last?.push(index);
    else groups.push([index]);
  }
  return groups;
}

function byHash(a: Analysed, b: Analysed): number {
  const hash = ({ answer }: Analysed) => ('sha256' in answer ? answer.sha256 : '');
  return hash(a) < hash(b) ? -1 : hash(a) > hash(b) ? 1 : 0;
}

function newestBySource(
  ready: readonly ReadyRecording[],
  startOf: (ready: ReadyRecording) => number,
): Map<string, number> {
  const newest = new Map<string, number>();
  for (const one of ready)
    newest.set(one.source, Math.max(startOf(one), newest.get(one.source) ?? Number.NEGATIVE_INFINITY));
  return newest;
}
