import { type IntakeTimings, pointPath } from '../config/site.ts';
import { spansOf } from './recording-time.ts';
import type { ReadyRecording } from './verdicts.ts';

/**
 * Holds old files back until their batch is complete: a logger that was cut off sends days at once, in any order, and
 * they must be evaluated in the order in which they were recorded. An old file waits until nothing more came for its
 * points for `backlogQuietMs`, at most `backlogWaitMs` from the first one on. A batch that was let through waits no more,
 * in however many rounds it is taken; what comes for its points meanwhile is another batch.
 */
export class Backlog {
  readonly #monotonicMs: () => number;
  readonly #held = new Map<string, { firstMs: number; newestMs: number; readonly paths: Set<string> }>();
  #letThrough: ReadonlySet<string> = new Set();

  constructor(monotonicMs: () => number) {
    this.#monotonicMs = monotonicMs;
  }

  split(
    ready: readonly ReadyRecording[],
    isOld: (ready: ReadyRecording) => boolean,
    timings: Pick<IntakeTimings, 'backlogQuietMs' | 'backlogWaitMs'>,
  ): { readonly now: ReadyRecording[]; readonly held: ReadyRecording[]; readonly againInMs: number | null } {
    const nowMs = this.#monotonicMs();
    const bySource = new Map<string, ReadyRecording[]>();
    const now: ReadyRecording[] = [];
    for (const one of ready) {
      if (this.#letThrough.has(one.path)) {
        now.push(one);
        continue;
      }
      const files = bySource.get(keyOf(one));
      if (files === undefined) bySource.set(keyOf(one), [one]);
      else files.push(one);
    }
    for (const key of this.#held.keys()) if (!bySource.has(key)) this.#held.delete(key);
    const held: ReadyRecording[] = [];
    let againInMs: number | null = null;
    for (const [key, files] of bySource) {
      const leftMs = files.some(isOld) ? this.#leftMs(key, files, nowMs, timings) : 0;
      if (leftMs <= 0) {
        this.#held.delete(key);
        now.push(...files);
      } else {
        held.push(...files);
        againInMs = Math.min(againInMs ?? leftMs, leftMs);
      }
    }
    this.#letThrough = new Set(now.map(({ path }) => path));
    return { now, held, againInMs };
  }

  #leftMs(
    key: string,
    files: readonly ReadyRecording[],
    nowMs: number,
    { backlogQuietMs, backlogWaitMs }: Pick<IntakeTimings, 'backlogQuietMs' | 'backlogWaitMs'>,
  ): number {
    let batch = this.#held.get(key);
    if (batch === undefined) {
      batch = { firstMs: nowMs, newestMs: nowMs, paths: new Set() };
      this.#held.set(key, batch);
    }
    for (const { path } of files) {
      if (batch.paths.has(path)) continue;
      batch.paths.add(path);
      batch.newestMs = nowMs;
    }
    return Math.min(batch.newestMs + backlogQuietMs, batch.firstMs + backlogWaitMs) - nowMs;
  }
}

/** Files of the same points wait together. */
function keyOf(ready: ReadyRecording): string {
  return ready.points.map(pointPath).join('\n');
}

/** Recorded so long before it came that others may be missing in between. */
export function isOld(ready: ReadyRecording, startMs: number): boolean {
  return ready.arrivedMs - startMs > 2 * spansOf(ready.points).intervalMs;
}
