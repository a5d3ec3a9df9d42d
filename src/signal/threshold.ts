import { toeplitzEigenvalues } from './eigenvalues.ts';
import { Kept } from './kept.ts';
import { windowCorrelations } from './overlap.ts';
import { countsOfSegments, type Segments, segmentsKey, totalSegments } from './pooled-segments.ts';
import { logUpperTail, type QuadraticForm, upperPoint } from './quadratic-form.ts';
import { makeWindow, type WindowName } from './window.ts';

/** How a density was averaged: all that the spread of its noise lines depends on. */
export interface AveragingShape {
  readonly window: WindowName;
  readonly segmentSamples: number;
  readonly hopSamples: number;
  /** Segments averaged, K; those of each recording where several are pooled. */
  readonly averages: Segments;
}

/** What noise looks like on one line of an averaged density, as ratios to its mean. */
export interface NoiseStatistics {
  /** Median over mean: ln 2 for one average, towards 1 for many. */
  readonly medianOverMean: number;
  /** Relative standard deviation of the median of so many lines, neighbours being correlated by the window. */
  medianDeviation(lines: number): number;
  /**
   * Gives the ratio to the measured floor that noise passes with probability `perLine` (for one line), the floor being
   * the median of `lines` lines and so uncertain itself. To 0.1 %. Each count of lines is worked out once.
   */
  thresholds(perLine: number): (lines: number) => number;
}

/** Largest number of averages whose eigenvalues are all computed; see `averagedNoise`. */
const mostEigenvalues = 128;

/** A site has a handful of configurations. */
const kept = new Kept<string, NoiseStatistics>(64);

/**
 * Distribution of a noise line of an averaged density over its mean: sum lambda_i E_i / K, E_i unit exponentials,
 * lambda_i the eigenvalues of the segments' correlation matrix R[i][j] = rho_|i - j|, rho_m the window's amplitude
 * correlation at m hops. (The line values of a segment are complex Gaussian; their phases turn with the hop, which
 * leaves the eigenvalues as they are.) Holds where the density changes little within the main lobe.
 *
 * Past 128 averages ln det (I - s R) grows by the same amount with each further one, but for terms that vanish
 * exponentially (the strong limit theorem of Szegő 1952 for banded Toeplitz matrices), so the eigenvalues of 128 and
 * of 64 averages, counted (K - 64) / 64 and (128 - K) / 64 times, stand for all. Error of the tail at 1e-6: under
 * 1e-7 of it, for all windows, up to 95 % overlap. Segments of pooled recordings are independent of each other: the
 * eigenvalues of each recording's own matrix side by side.
 */
export function averagedNoise(shape: AveragingShape): QuadraticForm {
  const total = totalSegments(shape.averages);
  const correlations = windowCorrelations(shape.window, shape.segmentSamples, shape.hopSamples);
  const weights: number[] = [];
  const shapes: number[] = [];
  const add = (segments: number, count: number): void => {
    for (const eigenvalue of toeplitzEigenvalues(correlations, segments)) {
      // Those at the rounding error, of segments that only repeat others, would carry nothing.
      if (eigenvalue < 1e-9) continue;
      weights.push(eigenvalue / total);
      shapes.push(count);
    }
  };
  for (const [averages, recordings] of countsOfSegments(shape.averages)) {
    if (averages <= mostEigenvalues) {
      add(averages, recordings);
    } else {
      const half = mostEigenvalues / 2;
      add(mostEigenvalues, (recordings * (averages - half)) / half);
      add(half, (recordings * (mostEigenvalues - averages)) / half);
    }
  }
  return { weights: Float64Array.from(weights), shapes: Float64Array.from(shapes) };
}

/** The statistics of one configuration; computed once (some milliseconds), then remembered. */
export function noiseStatistics(shape: AveragingShape): NoiseStatistics {
  const key = `${shape.window} ${shape.segmentSamples} ${shape.hopSamples} ${segmentsKey(shape.averages)}`;
  return kept.get(key, () => statisticsOf(shape, averagedNoise(shape)));
}

/**
 * Lines that are worth one independent line of noise: N sum w⁴ / (sum w²)², the squared correlation of the line
 * values added up over all distances (Parseval). Rectangular 1, Hann 35/18.
 */
export function linesPerIndependentLine(window: WindowName, segmentSamples: number): number {
  let squares = 0;
  let fourths = 0;
  for (const value of makeWindow(window, segmentSamples)) {
    squares += value ** 2;
    fourths += value ** 4;
  }
  return (segmentSamples * fourths) / squares ** 2;
}

/** The statistics of lines that are distributed like `form` about a mean of 1. */
export function statisticsOf(shape: AveragingShape, form: QuadraticForm): NoiseStatistics {
  const median = upperPoint(form, Math.log(0.5));
  const slope =
    (Math.exp(logUpperTail(form, 0.99 * median)) - Math.exp(logUpperTail(form, 1.01 * median))) / 0.02;
  // Deviation of a sample median, 1 / (2 f sqrt n) (David & Nagaraja 2003, 10.3), over the median.
  const oneLine = 0.5 / slope;
  const perIndependent = linesPerIndependentLine(shape.window, shape.segmentSamples);
  const deviation = (lines: number): number => oneLine * Math.sqrt(perIndependent / lines);
  const byProbability = new Kept<number, (lines: number) => number>(16);
  return {
    medianOverMean: median,
    medianDeviation: deviation,
    thresholds: (perLine) =>
      byProbability.get(perLine, () => {
        const ratios: number[] = [];
        return (lines) => {
          ratios[lines] ??= uncertainFloorThreshold(form, Math.log(perLine), deviation(lines));
          return ratios[lines];
        };
      }),
  };
}

/**
 * The ratio x with E[P(form > x e^(d Z))] = p, Z Gaussian: the floor in the denominator is known to a relative
 * deviation d only, and its low readings make most of the false peaks.
 */
function uncertainFloorThreshold(form: QuadraticForm, logProbability: number, deviation: number): number {
  const exact = upperPoint(form, logProbability);
  const tail = tabulateTail(form, Math.log(exact) - 6 * deviation, Math.log(exact) + 12 * deviation);
  const excess = (logX: number): number => {
    let sum = 0;
    let weights = 0;
    for (let k = -40; k <= 40; k++) {
      const z = 0.15 * k;
      const weight = Math.exp(-0.5 * z * z);
      weights += weight;
      sum += weight * Math.exp(tail(logX + deviation * z));
    }
    return Math.log(sum / weights) - logProbability;
  };
  let low = Math.log(exact);
  let high = low + 6 * deviation;
  for (let k = 0; k < 30; k++) {
    const middle = 0.5 * (low + high);
    if (excess(middle) > 0) low = middle;
    else high = middle;
  }
  return Math.exp(0.5 * (low + high));
}

/** ln P(form > e^u) between two values of u by cubic interpolation; held at the ends, where it hardly counts. */
function tabulateTail(form: QuadraticForm, from: number, to: number): (u: number) => number {
  const intervals = 32;
  const step = (to - from) / intervals;
  const values = Float64Array.from({ length: intervals + 1 }, (_, i) =>
    logUpperTail(form, Math.exp(from + i * step)),
  );
  return (u) => {
    const position = Math.min(intervals, Math.max(0, (u - from) / step));
    const i = Math.min(intervals - 2, Math.max(1, Math.floor(position)));
    const t = position - i;
    const [a, b, c, d] = [values[i - 1], values[i], values[i + 1], values[i + 2]];
    return (
      b + t * (0.5 * (c - a) + t * (a - 2.5 * b + 2 * c - 0.5 * d + t * (1.5 * (b - c) + 0.5 * (d - a))))
    );
  };
}
