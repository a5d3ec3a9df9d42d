import type { FileLook } from './file-source.ts';
import type { ReadyRecording } from './verdicts.ts';

/** In which parts ready recordings are analysed and decided. */
export type StartOf = (ready: ReadyRecording) => number;

/** Names a file for the attempts that are noted in the ledger. */
export function attemptKey(look: FileLook): string {
  return `${look.dev}:${look.ino}:${look.size}:${look.mtimeMs}`;
}

export function isSuspect(ready: ReadyRecording | undefined, suspects: ReadonlyMap<string, number>): boolean {
  return ready !== undefined && suspects.has(attemptKey(ready.header.look));
}

/** Suspects travel alone, the others in batches of what may wait. */
export function* batches(
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
export function sameStart(ready: readonly ReadyRecording[], startOf: StartOf): number[][] {
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

/** Newest start of each source. */
export function newestBySource(ready: readonly ReadyRecording[], startOf: StartOf): Map<string, number> {
  const newest = new Map<string, number>();
  for (const one of ready)
    newest.set(one.source, Math.max(startOf(one), newest.get(one.source) ?? Number.NEGATIVE_INFINITY));
  return newest;
}
