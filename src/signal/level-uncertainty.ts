/**
 * How well levels of noise will be known from a recording that is still to be made: the widths that `bandInterval`
 * gives on the average, without a spectrum at hand.
 *
 * A level of nu degrees of freedom holds the truth between nu S / chi²(1 - a/2) and nu S / chi²(a/2). A single line has
 * nu = 2 K_eff (Welch 1967); a band of noise nu = 2 S² / V with the V of `band-interval.ts`, for an even spectrum near
 * 2 B T, bandwidth by length (Bendat & Piersol, Random Data). A steady tone is known far better than that.
 */
import type { IntervalKernel } from './band-interval.ts';
import { chiSquareQuantile } from './statistics.ts';

/** Where the truth lies about a level, dB: `lowDb` below 0, `highDb` above. The wider side is `highDb`. */
export interface LevelUncertainty {
  readonly lowDb: number;
  readonly highDb: number;
  readonly degreesOfFreedom: number;
  readonly confidencePercent: number;
}

/** Checked: 40 degrees of freedom, 95 %: -1.71 and +2.14 dB. */
export function uncertaintyOf(degreesOfFreedom: number, confidencePercent: number): LevelUncertainty {
  const tail = 0.5 * (1 - confidencePercent / 100);
  const db = (share: number) =>
    10 * Math.log10(degreesOfFreedom / chiSquareQuantile(share, degreesOfFreedom));
  return { lowDb: db(1 - tail), highDb: db(tail), degreesOfFreedom, confidencePercent };
}

/** A single line of noise. Checked: Hann, 50 %, 39 averages (36.9973): -1.29 and +1.52 dB at 95 %. */
export function lineUncertainty(effectiveAverages: number, confidencePercent: number): LevelUncertainty {
  return uncertaintyOf(2 * effectiveAverages, confidencePercent);
}

/**
 * The level of a band of noise that is even before integration; `weights` are the band's (`band-level.ts`). Checked:
 * Hann, 50 %, 100 Hz for 2 s: the mean square deviates by 7.3 %, where B T alone says 7.07 %.
 */
export function bandUncertainty(
  weights: Float64Array,
  kernel: IntervalKernel,
  confidencePercent: number,
): LevelUncertainty {
  const power = weights.reduce((sum, weight) => sum + weight, 0);
  let variance = 0;
  for (let d = 0; d < kernel.lineCoupling.length && d < weights.length; d++) {
    let sum = 0;
    for (let j = d; j < weights.length; j++) sum += weights[j] * weights[j - d];
    // The kernel's division by 1 + c/K corrects for powers that are themselves estimates; here they are given.
    const corrected = kernel.lineCoupling[d];
    variance += ((d === 0 ? 1 : 2) * sum * corrected) / (1 - corrected);
  }
  return uncertaintyOf((2 * power ** 2) / variance, confidencePercent);
}

/** Fewest degrees of freedom of which neither side is wider than `db`. Checked: 2.14 dB at 95 %: 40. */
export function degreesFor(db: number, confidencePercent: number): number {
  let [few, many] = [0.5, 1];
  while (uncertaintyOf(many, confidencePercent).highDb > db) [few, many] = [many, 2 * many];
  while (many / few > 1 + 1e-6) {
    const middle = Math.sqrt(few * many);
    if (uncertaintyOf(middle, confidencePercent).highDb > db) few = middle;
    else many = middle;
  }
  return many;
}
