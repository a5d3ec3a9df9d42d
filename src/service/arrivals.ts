import { codedPrefix, pathBytes } from '../acquisition/file-name.ts';
import {
  type FileObservation,
  type HeaderLook,
  headerLook,
  type Settling,
  settle,
} from '../acquisition/settling.ts';
import type { SeenFile } from '../acquisition/sweep.ts';
import { nothingSaid } from '../config/sample-layout.ts';
import type { Point } from '../config/site.ts';
import type { HeaderAnswer, HeaderTask } from './recording-task.ts';
import { isSidecarName, sidecarPairs, waitForSidecarMs } from './sidecar-pairs.ts';
import type { SiteView } from './site-view.ts';
import { type Arrival, collect, givenUp, type Look, notRead, ready, type Verdict } from './verdicts.ts';

/**
 * What lies in the drop folder, and how far each file is: settling, looked into, ready, given up. Kept in memory only:
 * after a restart every file settles again.
 *
 * A recording and its sidecar settle together: a change of either begins the wait anew.
 */
interface Watched {
  /** Which file it is, of those that came under the name. */
  readonly inode: string;
  /** Monotonic time at which it was first seen. */
  readonly noticedMs: number;
  settling: Settling | null;
  looked: HeaderAnswer | null;
}

export interface ArrivalsTools {
  readonly view: () => SiteView;
  readonly wallMs: () => number;
  readonly monotonicMs: () => number;
  readonly header: (task: HeaderTask) => Promise<HeaderAnswer>;
  /** True where `after_reading: keep` left a file that is in the ledger already. */
  readonly isKept: (file: SeenFile) => boolean;
  /** The service was asked to stop: the others are looked into by the next run. */
  readonly isStopping: () => boolean;
}

/** Files that are looked into at a time; the worker pool bounds what runs at once. */
const lookedAtOnce = 64;

export class Arrivals {
  readonly #tools: ArrivalsTools;
  #watched = new Map<string, Watched>();

  constructor(tools: ArrivalsTools) {
    this.#tools = tools;
  }

  /** The file was decided on, changed under the reader, or was replaced: what comes under its name settles anew. */
  forget(path: string): void {
    this.#watched.delete(path);
  }

  async look(files: readonly SeenFile[]): Promise<Look> {
    const view = this.#tools.view();
    this.#forgetVanished(new Set(files.map(({ path }) => path)));
    const kept = new Set(files.filter((file) => this.#tools.isKept(file)).map(({ path }) => path));
    const sidecarOf = sidecarPairs(files);
    // What lies beside a kept recording and was not read with it has come too late.
    const pairs = [...sidecarOf].filter(([recording]) => !kept.has(recording));
    const paired = new Set(pairs.map(([, { path }]) => path));
    const verdicts: Verdict[] = [];
    const mains = files.filter(({ path }) => !paired.has(path) && !kept.has(path));
    for (let n = 0; n < mains.length && !this.#tools.isStopping(); n += lookedAtOnce) {
      const part = mains.slice(n, n + lookedAtOnce);
      verdicts.push(
        ...(await Promise.all(part.map((file) => this.#one(view, file, sidecarOf.get(file.path) ?? null)))),
      );
    }
    return collect(verdicts);
  }

  #forgetVanished(there: ReadonlySet<string>): void {
    for (const path of this.#watched.keys()) if (!there.has(path)) this.#watched.delete(path);
  }

  async #one(view: SiteView, file: SeenFile, sidecar: SeenFile | null): Promise<Verdict> {
    if (file.nameProblem === null && isSidecarName(file.path)) return this.#orphan(view, file);
    if (file.nameProblem === null && view.files.isIgnored(file.path)) return { at: 'ignored' };
    const points = file.nameProblem === null ? view.files.pointsFor(file.path) : [];
    const watched = this.#watch(file);
    const waits = waitsFor(view, points);
    for (;;) {
      const { verdict, state } = settle(watched.settling, this.#observe(file, sidecar, watched), waits);
      if (state.stillSinceMs !== watched.settling?.stillSinceMs) watched.looked = null;
      watched.settling = state;
      if (verdict.verdict === 'wait') return { at: 'waiting', againInMs: verdict.againInMs, points };
      const arrivedMs = this.#arrivedMs(watched);
      const { looked } = watched;
      const arrival: Arrival = { file, sidecar, arrivedMs, looked };
      if (file.nameProblem !== null) return givenUp(view, arrival, file.nameProblem, 'bad-name');
      if (points.length === 0) return { at: 'unassigned', file: { path: file.path, look: file, arrivedMs } };
      if (verdict.verdict === 'give-up') return givenUp(view, arrival, verdict.reason, 'unreadable');
      if (verdict.verdict === 'look') {
        const answer = await this.#tools.header(this.#headerTask(view, file, sidecar, points));
        if (answer.kind === 'gone') return { at: 'ignored' };
        if (answer.kind === 'left-alone') return notRead(view, arrival, answer.reason);
        watched.looked = answer;
        continue;
      }
      const waitMs = this.#sidecarWaitMs(points, sidecar, state, waits.incompleteAfterMs);
      if (waitMs > 0) return { at: 'waiting', againInMs: waitMs, points };
      return ready(view, arrival, points, verdict.zeroTail);
    }
  }

  /** Another file under the name is another arrival. */
  #watch(file: SeenFile): Watched {
    const inode = `${file.dev}:${file.ino}`;
    const known = this.#watched.get(file.path);
    if (known?.inode === inode) return known;
    const watched = { inode, noticedMs: this.#tools.monotonicMs(), settling: null, looked: null };
    this.#watched.set(file.path, watched);
    return watched;
  }

  /** By the clock as it shows now: somebody may have set it since. */
  #arrivedMs({ noticedMs }: Watched): number {
    return this.#tools.wallMs() - (this.#tools.monotonicMs() - noticedMs);
  }

  #observe(file: SeenFile, sidecar: SeenFile | null, watched: Watched): FileObservation {
    return {
      sizeBytes: file.size,
      modifiedMs: Math.max(file.mtimeMs, sidecar?.mtimeMs ?? 0),
      changedMs: Math.max(file.ctimeMs, sidecar?.ctimeMs ?? 0),
      inode: `${watched.inode}${sidecar === null ? '' : `+${sidecar.ino}:${sidecar.size}`}`,
      monotonicMs: this.#tools.monotonicMs(),
      header: watched.looked === null ? null : lookOf(watched.looked, file.size),
    };
  }

  #headerTask(
    view: SiteView,
    file: SeenFile,
    sidecar: SeenFile | null,
    points: readonly Point[],
  ): HeaderTask {
    return {
      task: 'header',
      path: `${view.site.folders.drop}/${file.path}`,
      sidecarPath: sidecar === null ? null : `${view.site.folders.drop}/${sidecar.path}`,
      largestBytes: view.site.largestFileBytes,
      layout: points[0]?.recordings.layout ?? nothingSaid,
    };
  }

  #sidecarWaitMs(
    points: readonly Point[],
    sidecar: SeenFile | null,
    { firstSeenMs }: Settling,
    incompleteAfterMs: number,
  ): number {
    return waitForSidecarMs(points, sidecar, firstSeenMs, this.#tools.monotonicMs(), incompleteAfterMs);
  }

  /** A sidecar without its recording: it may come before it, and is given up when none comes. */
  #orphan(view: SiteView, file: SeenFile): Verdict {
    const watched = this.#watch(file);
    watched.settling ??= settle(null, this.#observe(file, null, watched), waitsFor(view, [])).state;
    const leftMs =
      watched.settling.firstSeenMs + view.site.timings.incompleteAfterMs - this.#tools.monotonicMs();
    if (leftMs > 0) return { at: 'waiting', againInMs: leftMs, points: [] };
    const reason = 'no recording came with this sidecar, or it came after its recording had been read';
    const arrivedMs = this.#arrivedMs(watched);
    return givenUp(view, { file, sidecar: null, arrivedMs, looked: null }, reason, 'late-sidecar');
  }
}

/** Absolute path of a file in the drop folder; a name that is no text keeps its bytes. */
export function absolutePath(folder: string, path: string): string | Uint8Array {
  return path.startsWith(codedPrefix)
    ? Buffer.concat([Buffer.from(`${folder}/`), pathBytes(path)])
    : `${folder}/${path}`;
}

function waitsFor(view: SiteView, points: readonly Point[]) {
  const settleMs =
    points.length === 0 ? 5_000 : Math.max(...points.map(({ recordings }) => recordings.settleMs));
  return { settleMs, incompleteAfterMs: view.site.timings.incompleteAfterMs };
}

function lookOf(answer: HeaderAnswer, size: number): HeaderLook {
  if (answer.kind === 'header') return headerLook(answer.header, size, false, answer.zeroTail);
  if (answer.kind === 'refused') return headerLook(answer.refusal, size, answer.headIsZeros, false);
  return { complete: false, zeroTail: false, refused: null };
}
