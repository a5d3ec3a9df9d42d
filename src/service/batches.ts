import type { FileLook } from './file-source.ts';
import type { MeasureAnswer } from './recording-task.ts';
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

/** The order of decisions; among equals the hash decides, once it is known. */
export function inOrder(ready: readonly ReadyRecording[], startOf: StartOf): ReadyRecording[] {
  return [...ready].sort(
    (a, b) => startOf(a) - startOf(b) || compare(a.source, b.source) || compare(a.path, b.path),
  );
}

function compare(a: string, b: string): number {
  return a < b ? -1 : a > b ? 1 : 0;
}

/** What the analysis of a recording says. */
export type Analysed = {
  readonly ready: ReadyRecording;
  readonly answer:
    | MeasureAnswer
    | { readonly kind: 'stopped'; readonly reason: string }
    | { readonly kind: 'no-worker'; readonly reason: string };
};

export function byHash(a: Analysed, b: Analysed): number {
  const hash = ({ answer }: Analysed) => ('sha256' in answer ? answer.sha256 : '');
  return hash(a) < hash(b) ? -1 : hash(a) > hash(b) ? 1 : 0;
}

/** `left`: could not be decided on for the ledger's sake. `notBegun`: the time of the round was up before. */
export interface Taken {
  readonly decided: number;
  readonly left: number;
  readonly notBegun: readonly ReadyRecording[];
}
