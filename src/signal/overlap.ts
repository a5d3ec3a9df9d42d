import { mostSegments, pairShare, type Segments, totalSegments } from './pooled-segments.ts';
import { makeWindow, type WindowName } from './window.ts';

/**
 * Amplitude correlation of a window with itself at m hops, rho_m = sum w[n] w[n + m hop] / sum w², m = 0, 1, ... as
 * long as the segments overlap. Not squared: Welch's own rho is the square of this one.
 * Checked: Hann at 50 %: 1, 1/6. At 75 %: 1, 0.659155, 0.166667, 0.007512.
 */
export function windowCorrelations(name: WindowName, segmentSamples: number, hop: number): Float64Array {
  const window = makeWindow(name, segmentSamples);
  const correlations = new Float64Array(Math.ceil(segmentSamples / hop));
  for (let m = 0; m < correlations.length; m++) {
    let sum = 0;
    for (let n = m * hop; n < segmentSamples; n++) sum += window[n] * window[n - m * hop];
    correlations[m] = sum;
  }
  const power = correlations[0];
  return correlations.map((sum) => sum / power);
}

/**
 * Independent averages that overlapped ones are worth on Gaussian noise: K / (1 + 2 sum (1 - m/K) rho_m²)
 * (Welch 1967). Not monotonic in overlap: past about 75 % (Hann) further segments only repeat data. Where recordings
 * are pooled, the share of pairs takes the place of 1 - m/K: recordings of equal length add up.
 * Checked: Hann, 50 %, K = 39: 36.9973.
 */
export function effectiveAverages(
  name: WindowName,
  segmentSamples: number,
  hop: number,
  averages: Segments,
): number {
  const correlations = windowCorrelations(name, segmentSamples, hop);
  let sum = 0;
  for (let m = 1; m < Math.min(correlations.length, mostSegments(averages)); m++) {
    sum += pairShare(averages, m) * correlations[m] ** 2;
  }
  return totalSegments(averages) / (1 + 2 * sum);
}
