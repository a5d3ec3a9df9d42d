import type { Digits } from './csv-number.ts';

/**
 * Follows a time column from row to row: rate from first to last, and how uneven its steps are.
 *
 * Times are written with so many digits and no more, so even steps look uneven by up to one unit of the last digit:
 * 1/25600 s in microseconds reads 39, 39, 40, ... That much is not held against the file where it happens in at
 * least 1 in 100 steps, as rounding does. A step that is odd once or twice is a gap, and counts in full.
 */
export interface TimeSteps {
  /** Time of a row in the column's own unit, counted from any fixed instant. */
  take(time: number): void;
  readonly digits: Digits;
  /** `unitS`: seconds of one unit of the column. */
  result(unitS: number): TimeStepsResult;
}

export interface TimeStepsResult {
  /** Hz; null with fewer than two rows, or where time does not run forward. */
  readonly rateHz: number | null;
  /** Greatest deviation of a step from the mean step beyond rounding, as a ratio; Infinity where time stands still. */
  readonly deviation: number;
}

const roundingShare = 0.01;
const fewGaps = 2;
/** Digits that a double can hold. */
const mostSignificant = 16;

export function timeSteps(): TimeSteps {
  const digits: Digits = { decimals: 0, significant: 0 };
  let rows = 0;
  let first = 0;
  let previous = 0;
  // The step that most rows make, found by majority vote (Boyer and Moore, 1981), and the votes it is ahead.
  let usualStep = 0;
  let ahead = 0;
  let least = Number.POSITIVE_INFINITY;
  let most = Number.NEGATIVE_INFINITY;
  let largest = 0;

  return {
    digits,
    take(time) {
      const size = Math.abs(time);
      if (size > largest) largest = size;
      if (rows === 0) first = time;
      else {
        const step = time - previous;
        const same = 1e-6 * Math.abs(usualStep) + 1.5 * Number.EPSILON * largest;
        if (ahead === 0) usualStep = step;
        if (ahead === 0 || Math.abs(step - usualStep) <= same) ahead++;
        else ahead--;
        if (step < least) least = step;
        if (step > most) most = step;
      }
      previous = time;
      rows++;
    },
    result(unitS) {
      if (rows < 2) return { rateHz: null, deviation: 0 };
      const steps = rows - 1;
      const mean = (previous - first) / steps;
      if (!(mean > 0)) return { rateHz: null, deviation: Number.POSITIVE_INFINITY };
      const blur = 2 * Number.EPSILON * largest;
      // Of the other steps, each takes one vote from the usual one and lacks its own.
      const unusual = (steps - ahead) / 2;
      const rounded = unusual > Math.max(roundingShare * steps, fewGaps);
      const excused = rounded ? writtenUnit(digits, largest) * 1.001 + blur : blur;
      const deviation = Math.max(0, Math.max(most - mean, mean - least) - excused) / mean;
      return { rateHz: 1 / (mean * unitS), deviation };
    },
  };
}

/** One unit of the last digit that the largest time was written with, for fixed decimals and fixed digits alike. */
function writtenUnit(digits: Digits, largest: number): number {
  const byDecimals = 10 ** -digits.decimals;
  if (digits.significant === 0 || largest === 0) return byDecimals;
  const significant = Math.min(digits.significant, mostSignificant);
  return Math.max(byDecimals, 10 ** (Math.floor(Math.log10(largest)) + 1 - significant));
}
