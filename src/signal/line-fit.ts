import tQuantile from '@stdlib/stats-base-dists-t-quantile';

/**
 * Straight line through points by least squares, with what it is worth.
 * Formulas: Draper and Smith, Applied Regression Analysis (1998), chapter 1; crossing by Fieller (1954).
 */
export interface LineFit {
  readonly points: number;
  readonly intercept: number;
  readonly slope: number;
  readonly interceptError: number;
  /** Standard error of the slope. */
  readonly slopeError: number;
  /** Standard deviation about the line, with n - 2 degrees of freedom. */
  readonly residualDeviation: number;
  readonly xMean: number;
  readonly yMean: number;
  /** Sum of squared distances of x from its mean. */
  readonly sxx: number;
}

/** @returns null below three points, or where all x are the same */
export function fitLine(x: ArrayLike<number>, y: ArrayLike<number>): LineFit | null {
  const points = x.length;
  if (points < 3) return null;
  const xMean = meanOf(x);
  const yMean = meanOf(y);
  let [sxx, sxy] = [0, 0];
  for (let n = 0; n < points; n++) {
    sxx += (x[n] - xMean) ** 2;
    sxy += (x[n] - xMean) * (y[n] - yMean);
  }
  if (sxx === 0) return null;
  const slope = sxy / sxx;
  let residuals = 0;
  for (let n = 0; n < points; n++) residuals += (y[n] - yMean - slope * (x[n] - xMean)) ** 2;
  const residualDeviation = Math.sqrt(residuals / (points - 2));
  return {
    points,
    intercept: yMean - slope * xMean,
    slope,
    interceptError: residualDeviation * Math.sqrt(1 / points + xMean ** 2 / sxx),
    slopeError: residualDeviation / Math.sqrt(sxx),
    residualDeviation,
    xMean,
    yMean,
    sxx,
  };
}

export interface LineValue {
  readonly value: number;
  /** Half width of the interval of the line itself at x. */
  readonly lineHalfWidth: number;
  /** Half width of the interval within which one further reading at x lies. */
  readonly readingHalfWidth: number;
}

export function lineAt(fit: LineFit, x: number, confidencePercent: number): LineValue {
  const t = tOf(fit, confidencePercent);
  const part = 1 / fit.points + (x - fit.xMean) ** 2 / fit.sxx;
  return {
    value: fit.yMean + fit.slope * (x - fit.xMean),
    lineHalfWidth: t * fit.residualDeviation * Math.sqrt(part),
    readingHalfWidth: t * fit.residualDeviation * Math.sqrt(1 + part),
  };
}

/** The interval of the slope is slope +- this. */
export function slopeHalfWidth(fit: LineFit, confidencePercent: number): number {
  return tOf(fit, confidencePercent) * fit.slopeError;
}

function tOf({ points }: LineFit, confidencePercent: number): number {
  return tQuantile(0.5 + confidencePercent / 200, points - 2);
}

function meanOf(values: ArrayLike<number>): number {
  let sum = 0;
  for (let n = 0; n < values.length; n++) sum += values[n];
  return sum / values.length;
}
