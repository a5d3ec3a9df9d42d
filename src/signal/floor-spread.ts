import { symmetricEigenvalues } from './eigenvalues.ts';
import { Kept } from './kept.ts';
import { upperPoint } from './quadratic-form.ts';
import { makeWindow, type WindowName } from './window.ts';

/** How segments lie and how they were gathered: what the spread of their levels depends on in steady noise. */
export interface GroupShape {
  readonly window: WindowName;
  readonly segmentSamples: number;
  readonly hopSamples: number;
  readonly segmentsPerGroup: number;
  readonly groups: number;
}

/** Share of steady recordings whose floor is called unsteady all the same. */
const falseShare = 0.001;

const keptLimits = new Kept<string, number>(64);
const keptCorrelations = new Kept<string, readonly number[]>(32);

/**
 * What the variance between groups (divisor groups - 1) of a level summed over many lines of steady noise passes in
 * one of a thousand recordings, over the level's variance in single segments.
 *
 * The groups' levels are sums over many lines and so Gaussian; those of segments m hops apart are correlated by
 * sum w²[n] w²[n - mH] / sum w⁴ (the squared correlations of all pairs of lines added up). With C the groups'
 * covariance matrix freed of its mean, the variance is sum lambda_i chi²(1) / (groups - 1), lambda_i the eigenvalues
 * of C, and the point comes from the exact tail of that sum. Independent segments, 5 groups: 18.467 / 4.
 */
export function floorSpreadLimit(shape: GroupShape): number {
  const key = [
    shape.window,
    shape.segmentSamples,
    shape.hopSamples,
    shape.segmentsPerGroup,
    shape.groups,
  ].join(' ');
  return keptLimits.get(key, () => limitOf(shape));
}

function limitOf(shape: GroupShape): number {
  const { window, segmentSamples, hopSamples, segmentsPerGroup, groups } = shape;
  const covariance = groupCovariance(
    segmentCorrelations(window, segmentSamples, hopSamples),
    segmentsPerGroup,
    groups,
  );
  const rowMeans = Float64Array.from({ length: groups }, (_, i) => {
    let sum = 0;
    for (let j = 0; j < groups; j++) sum += covariance[Math.abs(i - j)];
    return sum / groups;
  });
  const mean = rowMeans.reduce((sum, value) => sum + value, 0) / groups;
  const centred = new Float64Array(groups * groups);
  for (let i = 0; i < groups; i++) {
    for (let j = 0; j < groups; j++) {
      centred[i * groups + j] = covariance[Math.abs(i - j)] - rowMeans[i] - rowMeans[j] + mean;
    }
  }
  const eigenvalues = symmetricEigenvalues(centred, groups).filter((value) => value > 1e-12);
  const form = {
    weights: eigenvalues.map((value) => (2 * value) / (groups - 1)),
    shapes: new Float64Array(eigenvalues.length).fill(0.5),
  };
  return upperPoint(form, Math.log(falseShare));
}

/**
 * Variance of the mean, over the lines marked, of a segment's density over its expectation: the lines' squared
 * correlations |DFT of w² at their distance|² / (sum w²)² over all pairs. For all lines of a long spectrum it is
 * N sum w⁴ / (sum w²)² over the number of lines.
 */
export function levelVariance(window: WindowName, segmentSamples: number, marked: Uint8Array): number {
  const correlations = keptCorrelations.get(`${window} ${segmentSamples}`, () =>
    lineCorrelations(window, segmentSamples),
  );
  let lines = 0;
  for (const mark of marked) lines += mark;
  let sum = lines;
  for (let distance = 1; distance < correlations.length; distance++) {
    let pairs = 0;
    for (let k = distance; k < marked.length; k++) pairs += marked[k] & marked[k - distance];
    sum += 2 * pairs * correlations[distance];
  }
  return sum / lines ** 2;
}

/** Squared correlation of lines so many apart; none past the eighth for the square of a cosine sum of five terms. */
function lineCorrelations(window: WindowName, segmentSamples: number): readonly number[] {
  const squares = makeWindow(window, segmentSamples).map((value) => value * value);
  const power = squares.reduce((sum, value) => sum + value, 0);
  return Array.from({ length: 9 }, (_, distance) => {
    const turn = (2 * Math.PI * distance) / segmentSamples;
    return (squares.reduce((sum, value, n) => sum + value * Math.cos(turn * n), 0) / power) ** 2;
  });
}

/** Correlation of the levels of segments m hops apart, m = 0, 1, ... as long as they overlap. */
function segmentCorrelations(name: WindowName, segmentSamples: number, hop: number): Float64Array {
  const window = makeWindow(name, segmentSamples);
  const sums = new Float64Array(Math.ceil(segmentSamples / hop));
  for (let m = 0; m < sums.length; m++) {
    for (let n = m * hop; n < segmentSamples; n++) sums[m] += (window[n] * window[n - m * hop]) ** 2;
  }
  const whole = sums[0];
  return sums.map((sum) => sum / whole);
}

/** Covariance of groups so many groups apart, each the mean of `size` segments. */
function groupCovariance(correlations: Float64Array, size: number, groups: number): Float64Array {
  const result = new Float64Array(groups);
  for (let apart = 0; apart < groups; apart++) {
    let sum = 0;
    for (let shift = 1 - size; shift < size; shift++) {
      const m = Math.abs(apart * size + shift);
      if (m < correlations.length) sum += (size - Math.abs(shift)) * correlations[m];
    }
    result[apart] = sum / size ** 2;
  }
  return result;
}
