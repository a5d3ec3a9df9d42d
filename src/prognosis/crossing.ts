/**
 * Where a line reaches a level, after Fieller (1954): all x at which the level lies within the line's interval. The
 * line is given by a point that it goes through and its slope, whose errors are independent of each other (the mean of x
 * for least squares).
 */
export interface UncertainLine {
  readonly x: number;
  readonly y: number;
  readonly slope: number;
  readonly yVariance: number;
  readonly slopeVariance: number;
}

export interface Crossing {
  readonly at: number;
  readonly earliest: number;
  /** Null where the slope is not known well enough: the line may never reach the level. */
  readonly latest: number | null;
}

/**
 * @param reach half width of the interval in standard deviations (a quantile of Student's t, or of the Gaussian)
 * @returns null where the line never gets there: it is level or goes the other way
 */
export function crossingOf(line: UncertainLine, level: number, reach: number): Crossing | null {
  const { x, y, slope, yVariance, slopeVariance } = line;
  const rise = level - y;
  if (slope === 0) return null;
  const at = x + rise / slope;
  // (rise - slope d)² = reach² (yVariance + d² slopeVariance), solved for the distance d from x.
  const a = slope ** 2 - reach ** 2 * slopeVariance;
  const b = rise * slope;
  const c = rise ** 2 - reach ** 2 * yVariance;
  const root = Math.sqrt(Math.max(0, b ** 2 - a * c));
  if (a <= 0) {
    // One edge of the interval never meets the level; the other does where the level lies ahead.
    const towards = Math.sign(rise) * Math.sign(slope) || 1;
    const d = a === 0 ? c / (2 * b) : Math.max((b + root) / a, (b - root) / a);
    return { at, earliest: towards > 0 ? x + d : at, latest: null };
  }
  return { at, earliest: x + (b - root) / a, latest: x + (b + root) / a };
}
