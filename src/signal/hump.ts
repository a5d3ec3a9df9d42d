import type { NoiseFloor } from './floor.ts';

export interface HumpRegion {
  readonly firstLine: number;
  readonly lastLine: number;
  /** Density above the floor, summed over the lines. */
  readonly excess: number;
  /** Where that excess has its centre, in lines. */
  readonly centre: number;
}

/**
 * The lines of a peak that is wider than the window's main lobe, or null for a tone.
 *
 * From its highest line a tone falls into the nulls of its main lobe on both sides, down to the floor or to its side
 * lobes; two tones that the window can tell apart have a dip between them. So a peak is a hump if on either side no
 * line as far as two past the null falls below a quarter of its height or below `limit`, what noise and stronger peaks account for. (At one average
 * a hump of noise is itself a row of narrow maxima and is mostly told as tones.) The hump then reaches as far as the
 * mean over about a main lobe stays above the threshold and does not rise again by 6 dB.
 */
export function humpRegion(
  density: Float64Array,
  noise: NoiseFloor,
  halfWidth: number,
  line: number,
  limit: (line: number) => number,
): HumpRegion | null {
  const { floor, firstLine, lastLine } = noise;
  const height = density[line] - floor[line];
  const stays = (direction: 1 | -1): boolean => {
    for (let d = 1; d <= halfWidth + 2; d++) {
      const at = line + direction * d;
      // The flank of something stronger, which has been judged before, says nothing about this peak.
      if (at < firstLine || at > lastLine || density[at] > density[line]) return false;
      if (density[at] < Math.max(floor[at] + 0.25 * height, limit(at))) return false;
    }
    return true;
  };
  if (!stays(1) && !stays(-1)) return null;
  const reachTo = (direction: 1 | -1): number => {
    let at = line;
    let lowest = Number.POSITIVE_INFINITY;
    for (;;) {
      const next = at + direction;
      if (next < firstLine || next > lastLine) return at;
      const mean = meanAround(density, next, Math.ceil(halfWidth / 2));
      if (mean < limit(next)) return at;
      lowest = Math.min(lowest, mean);
      // Rising again by 6 dB: something else begins.
      if (mean > 4 * lowest) return at;
      at = next;
    }
  };
  const from = reachTo(-1);
  const to = reachTo(1);
  let excess = 0;
  let moment = 0;
  for (let k = from; k <= to; k++) {
    const above = Math.max(0, density[k] - floor[k]);
    excess += above;
    moment += k * above;
  }
  return { firstLine: from, lastLine: to, excess, centre: moment / excess };
}

function meanAround(density: Float64Array, line: number, side: number): number {
  let sum = 0;
  let count = 0;
  for (let k = Math.max(0, line - side); k <= Math.min(density.length - 1, line + side); k++) {
    sum += density[k];
    count++;
  }
  return sum / count;
}
