import { median } from './statistics.ts';

export interface RepairedPulses {
  /** Times of the pulses in the longest row without an interval that is neither one pulse nor a few missed ones. */
  readonly longest: readonly number[];
  /** Pulses in all, after repair. */
  readonly pulses: number;
  readonly missed: number;
  readonly doubled: number;
}

/** Intervals on either side whose median is what the next one is expected to be. */
const neighbours = 7;
/** An interval shorter than this part of the expected one may come from a pulse too many. */
const shortPart = 0.65;
/** How far an interval, or what it was repaired to, may differ from the expected one, as a part of it. */
const tolerance = 0.3;
/** Pulses in a row that may be put in: a wheel with two or three teeth left out as its mark is common. */
const mostMissed = 4;
/** Where no interval differs from another by more, there is nothing to repair. */
const evenPart = 1.4;

/**
 * Takes out pulses that came twice and puts in those that were missed, by the intervals around: seven on either side, so
 * that a speed that moves evenly is no fault. `times`: ascending, at least 2.
 */
export function repairPulses(times: Float64Array): RepairedPulses {
  if (isEven(times)) return { longest: Array.from(times), pulses: times.length, missed: 0, doubled: 0 };
  const single = withoutDoubled(times);
  const expected = expectedIntervals(single);
  let longest: number[] = [];
  let row = [single[0]];
  let missed = 0;
  let pulses = 1;
  for (let n = 0; n < expected.length; n++) {
    const interval = single[n + 1] - single[n];
    const steps = Math.max(1, Math.round(interval / expected[n]));
    const isRegular =
      steps <= mostMissed + 1 && Math.abs(interval - steps * expected[n]) < tolerance * expected[n];
    if (!isRegular) {
      if (row.length > longest.length) longest = row;
      row = [];
    } else {
      for (let step = 1; step < steps; step++) row.push(single[n] + (step * interval) / steps);
      missed += steps - 1;
      pulses += steps - 1;
    }
    row.push(single[n + 1]);
    pulses++;
  }
  if (row.length > longest.length) longest = row;
  return { longest, pulses, missed, doubled: times.length - single.length };
}

function isEven(times: Float64Array): boolean {
  let shortest = Number.POSITIVE_INFINITY;
  let longest = 0;
  for (let n = 1; n < times.length; n++) {
    const interval = times[n] - times[n - 1];
    if (interval < shortest) shortest = interval;
    if (interval > longest) longest = interval;
  }
  return longest <= evenPart * shortest;
}

/** Of two pulses too near each other that one goes whose absence leaves the more regular interval. */
function withoutDoubled(times: Float64Array): Float64Array {
  const expected = expectedIntervals(times);
  const kept: number[] = [times[0]];
  for (let n = 1; n < times.length; n++) {
    const last = kept[kept.length - 1];
    const wanted = expected[n - 1];
    if (times[n] - last >= shortPart * wanted) {
      kept.push(times[n]);
      continue;
    }
    const next = n + 1 < times.length ? times[n + 1] : null;
    const before = kept.length > 1 ? kept[kept.length - 2] : null;
    if (misfit(before, times[n], next, wanted) < misfit(before, last, next, wanted))
      kept[kept.length - 1] = times[n];
  }
  return Float64Array.from(kept);
}

/** How far the intervals before and after a pulse are from what is expected of them. */
function misfit(before: number | null, pulse: number, next: number | null, wanted: number): number {
  const left = before === null ? 0 : Math.abs(pulse - before - wanted);
  const right = next === null ? 0 : Math.abs(next - pulse - wanted);
  return left + right;
}

/** For each interval the median of those around it and itself. */
function expectedIntervals(times: Float64Array): Float64Array {
  const intervals = Float64Array.from({ length: times.length - 1 }, (_, n) => times[n + 1] - times[n]);
  return intervals.map((_, n) => median(intervals.subarray(Math.max(0, n - neighbours), n + neighbours + 1)));
}
