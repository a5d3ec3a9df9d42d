import { median } from '../signal/statistics.ts';

/**
 * A step told from a slope: a level that changed from one day to the next (a repair, another sensor, another duty) must not
 * be read as something that grows.
 */
export interface Step {
  /** Index of the first value after the step. */
  readonly at: number;
  /** Height in the values' unit (log levels: ln of the factor). */
  readonly height: number;
}

/** A step is looked for with at least so many values on each side. */
const leastBeside = 3;
/** Two levels must leave at most this share of what a line leaves. */
const mostLeftOver = 0.7;

/**
 * The step that explains the values clearly better than the straight line does, and better than a level that began to
 * grow on some day, if there is one. Compared is the sum of the distances: from the medians before and after, from the
 * line, from the level with its bend.
 *
 * @param besideLine distances of the values from their line
 * @param leastHeight smaller steps are not told
 */
export function stepIn(
  values: ArrayLike<number>,
  besideLine: ArrayLike<number>,
  leastHeight: number,
): Step | null {
  const all = Array.from(values);
  let best: (Step & { readonly left: number }) | null = null;
  for (let at = leastBeside; at <= all.length - leastBeside; at++) {
    const [before, after] = [all.slice(0, at), all.slice(at)];
    const [low, high] = [median(before), median(after)];
    const left = distances(before, low) + distances(after, high);
    if (best === null || left < best.left) best = { at, height: high - low, left };
  }
  if (best === null || Math.abs(best.height) < leastHeight) return null;
  const leftByLine = distances(Array.from(besideLine), 0);
  if (best.left > mostLeftOver * leftByLine || leftByBend(all) <= best.left) return null;
  return { at: best.at, height: best.height };
}

/** What the best of all bends leaves: a median up to some value, from there a line that begins at that median. */
function leftByBend(all: readonly number[]): number {
  let least = Number.POSITIVE_INFINITY;
  for (let at = leastBeside; at <= all.length - leastBeside; at++) {
    const level = median(all.slice(0, at));
    const after = all.slice(at);
    const slope = median(after.map((value, n) => (value - level) / (n + 1)));
    const left =
      distances(all.slice(0, at), level) +
      distances(
        after.map((value, n) => value - slope * (n + 1)),
        level,
      );
    least = Math.min(least, left);
  }
  return least;
}

function distances(values: readonly number[], from: number): number {
  return values.reduce((sum, value) => sum + Math.abs(value - from), 0);
}
