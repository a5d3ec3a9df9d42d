import stdlibChiSquareQuantile from '@stdlib/stats-base-dists-chisquare-quantile';

/** Factor that makes the median absolute deviation of Gaussian values estimate their standard deviation. */
export const madToDeviation = 1.4826;

/** Middle value; the mean of the two middle ones for an even count; NaN of nothing. The values keep their order. */
export function median(values: ArrayLike<number>): number {
  return quantile(values, 0.5);
}

/** Median of the distances from the median (not scaled); NaN of nothing. */
export function medianAbsoluteDeviation(values: ArrayLike<number>): number {
  const middle = median(values);
  return median(Float64Array.from(values, (value) => Math.abs(value - middle)));
}

/** As `median`, of ascending values. */
export function medianOfSorted(sorted: ArrayLike<number>): number {
  const half = (sorted.length - 1) / 2;
  const [below, above] = [sorted[Math.floor(half)], sorted[Math.ceil(half)]];
  return sorted.length === 0 ? Number.NaN : below + 0.5 * (above - below);
}

/** Median of the distances from `middle`, of ascending values: they grow to both sides, so that half of them are passed. */
export function deviationOfSorted(sorted: ArrayLike<number>, middle: number): number {
  const count = sorted.length;
  if (count === 0) return Number.NaN;
  let above = 0;
  for (let step = count; step > 0; step = Math.floor(step / 2))
    while (above + step <= count && sorted[above + step - 1] < middle) above += step;
  let below = above - 1;
  let [last, before] = [0, 0];
  for (let passed = 0; passed <= Math.floor(count / 2); passed++) {
    const down = below >= 0 ? middle - sorted[below] : Number.POSITIVE_INFINITY;
    const up = above < count ? sorted[above] - middle : Number.POSITIVE_INFINITY;
    before = last;
    last = Math.min(down, up);
    if (down <= up) below--;
    else above++;
  }
  return count % 2 === 1 ? last : before + 0.5 * (last - before);
}

/**
 * Value below which the given share (0 to 1) lies, linear between neighbouring ranks (definition 7 of Hyndman & Fan
 * 1996, numpy's default); NaN of nothing or of values with a NaN among them. The values keep their order.
 * Checked: share 0.25 of 1, 2, 3, 4 is 1.75.
 */
export function quantile(values: ArrayLike<number>, share: number): number {
  if (values.length === 0) return Number.NaN;
  const sorted = Float64Array.from(values).sort();
  // A typed array sorts NaN to its end.
  if (Number.isNaN(sorted[sorted.length - 1])) return Number.NaN;
  const rank = share * (sorted.length - 1);
  const below = Math.floor(rank);
  const above = Math.min(below + 1, sorted.length - 1);
  return sorted[below] + (rank - below) * (sorted[above] - sorted[below]);
}

/**
 * Quantile of the chi-square distribution, for 0 < share < 1 and any positive number of degrees of freedom.
 * Checked: share 0.975, 8 degrees: 17.5345.
 *
 * From 1000 degrees on, Wilson & Hilferty's cube (1931), good there to 2e-6 of the value at 0.025 and 0.975, to 3e-5
 * at 0.0005 and 0.9995; the library's upper quantiles are too large somewhere above 1000 degrees (10279.396 for
 * 10279.070 at share 0.975, 10000 degrees).
 */
export function chiSquareQuantile(share: number, degreesOfFreedom: number): number {
  if (degreesOfFreedom < 1000) return stdlibChiSquareQuantile(share, degreesOfFreedom);
  const spread = 2 / (9 * degreesOfFreedom);
  return degreesOfFreedom * (1 - spread + gaussianQuantile(share) * Math.sqrt(spread)) ** 3;
}

/** Quantile of the standard Gaussian distribution, 0 < share < 1. Checked: share 0.975: 1.959964. */
export function gaussianQuantile(share: number): number {
  if (share === 0.5) return 0;
  // The square of a Gaussian number has one degree of freedom.
  return Math.sign(share - 0.5) * Math.sqrt(stdlibChiSquareQuantile(Math.abs(2 * share - 1), 1));
}
