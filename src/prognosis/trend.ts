import { dependenceFactor, mannKendall, theilSen } from '../signal/rank-trend.ts';
import { gaussianQuantile, madToDeviation, median, medianAbsoluteDeviation } from '../signal/statistics.ts';
import { type Crossing, crossingOf, type UncertainLine } from './crossing.ts';
import { stepIn } from './step.ts';

/**
 * Whether a level grows, and when it would reach a limit if it went on so. Everything is reckoned on logarithms of
 * daily medians: damage grows by a share of itself, and hourly values depend on each other so much that a test on
 * them finds a trend in three of four windows that have none (simulated). Time is the machine's running time: what stands
 * still does not wear.
 *
 * Simulated (2,400 bands a morning, spread of 10 % from day to day that forgets within 36 h, 4 % from hour to hour,
 * window of 30 days): 0.4 rises claimed in bands that have none; a doubling every ten days claimed in 100 %, every thirty
 * days in 79 %; a step to twice the level called a step in 98 %. The 90 % interval of the time to a limit holds the true
 * time in 86 to 87 %.
 */
export interface DayLevel {
  /** Any time of that day by which people know it; used time. */
  readonly dayMs: number;
  /** Running hours of the machine at the middle of the day's recordings, from any beginning. */
  readonly runningHours: number;
  /** Median of the day's levels in one series and operating condition; > 0. */
  readonly level: number;
}

export const trendRules = {
  /** Running days below which nothing is said. */
  leastDays: 21,
  /** Running days that are looked at. */
  windowDays: 30,
  /** Two-sided significance of Mann and Kendall's test. */
  significance: 0.01,
  /** Growth over the window below which nothing is claimed. */
  leastGrowth: 1.4,
  confidencePercent: 90,
} as const;

/** What can be said of the days. Levels in the unit of the days, rates for a day of running. */
export type Trend =
  | { readonly kind: 'too-few-days'; readonly days: number; readonly needed: number }
  | {
      readonly kind: 'none';
      readonly days: number;
      readonly p: number;
      /**
       * Median of the last three days over that of the first three, where they lie apart by as much as a trend would have
       * to: 4 of a level that began to grow a week ago. Null where they do not.
       */
      readonly endsAt: number | null;
    }
  | TrendStep
  | TrendLine;

/** The level changed at once; too few days have passed since to speak of a trend. */
export interface TrendStep {
  readonly kind: 'step';
  readonly dayMs: number;
  /** Level after over level before. */
  readonly factor: number;
  readonly daysSince: number;
}

export interface TrendLine {
  readonly kind: 'rising' | 'falling';
  readonly days: number;
  readonly fromMs: number;
  readonly toMs: number;
  readonly p: number;
  /** Level at the end of the window over level at its beginning, by the line. */
  readonly growth: number;
  /** Growth in a running day, and its interval: 1.07 is 7 % a day. */
  readonly growthPerDay: number;
  readonly growthPerDayLow: number;
  readonly growthPerDayHigh: number;
  /** The line's level at the last day. */
  readonly levelNow: number;
  readonly confidencePercent: number;
  /** ln level over running hours, from which `timeToLimit` goes on. */
  readonly line: UncertainLine;
  readonly runningHoursNow: number;
}

const hoursADay = 24;

/** The trend of the newest `windowDays` days, oldest first. A step within them ends what was before it. */
export function trendOf(days: readonly DayLevel[], rules: typeof trendRules = trendRules): Trend {
  const window = days.slice(-rules.windowDays);
  if (window.length < rules.leastDays) {
    return { kind: 'too-few-days', days: window.length, needed: rules.leastDays };
  }
  const line = robustLine(window, rules.confidencePercent);
  if (line === null) return { kind: 'none', days: window.length, p: 1, endsAt: endsAt(window, rules) };
  const step = stepIn(line.logs, line.beside, Math.log(rules.leastGrowth));
  if (step !== null) {
    const after = window.slice(step.at);
    if (after.length >= rules.leastDays) return trendOf(after, rules);
    const factor = Math.exp(step.height);
    return { kind: 'step', dayMs: window[step.at].dayMs, factor, daysSince: after.length };
  }
  return claim(window, line, rules);
}

function claim(window: readonly DayLevel[], line: RobustLine, rules: typeof trendRules): Trend {
  const { p } = mannKendall(line.logs, line.factor);
  const [first, last] = [window[0], window[window.length - 1]];
  const rise = line.slope * (last.runningHours - first.runningHours);
  if (p >= rules.significance || Math.abs(rise) < Math.log(rules.leastGrowth)) {
    return { kind: 'none', days: window.length, p, endsAt: endsAt(window, rules) };
  }
  const perDay = (slope: number) => Math.exp(slope * hoursADay);
  return {
    kind: rise > 0 ? 'rising' : 'falling',
    days: window.length,
    fromMs: first.dayMs,
    toMs: last.dayMs,
    p,
    growth: Math.exp(rise),
    growthPerDay: perDay(line.slope),
    growthPerDayLow: perDay(line.slopeLow),
    growthPerDayHigh: perDay(line.slopeHigh),
    levelNow: Math.exp(line.y + line.slope * (last.runningHours - line.x)),
    confidencePercent: rules.confidencePercent,
    line: {
      x: line.x,
      y: line.y,
      slope: line.slope,
      yVariance: line.yVariance,
      slopeVariance: line.slopeVariance,
    },
    runningHoursNow: last.runningHours,
  };
}

const daysOfAnEnd = 3;

function endsAt(window: readonly DayLevel[], { leastGrowth }: typeof trendRules): number | null {
  const levels = window.map(({ level }) => level);
  const ratio = median(levels.slice(-daysOfAnEnd)) / median(levels.slice(0, daysOfAnEnd));
  return Math.max(ratio, 1 / ratio) >= leastGrowth ? ratio : null;
}

interface RobustLine extends UncertainLine {
  readonly logs: Float64Array;
  readonly beside: Float64Array;
  readonly factor: number;
  readonly slopeLow: number;
  readonly slopeHigh: number;
}

/** Variance of a median over that of a mean, Gaussian values: pi / 2. */
const medianOverMean = Math.PI / 2;

function robustLine(window: readonly DayLevel[], confidencePercent: number): RobustLine | null {
  const hours = Float64Array.from(window, ({ runningHours }) => runningHours);
  const logs = Float64Array.from(window, ({ level }) => Math.log(level));
  const plain = theilSen(hours, logs, 1);
  if (plain === null) return null;
  const beside = logs.map((log, n) => log - plain.intercept - plain.slope * hours[n]);
  const factor = dependenceFactor(beside);
  const z = gaussianQuantile(0.5 + confidencePercent / 200);
  const { slope, slopeLow, slopeHigh } = theilSen(hours, logs, z, factor) ?? plain;
  const spread = madToDeviation * medianAbsoluteDeviation(beside);
  return {
    logs,
    beside,
    factor,
    x: median(hours),
    y: median(logs),
    slope,
    slopeLow,
    slopeHigh,
    yVariance: (medianOverMean * factor * spread ** 2) / logs.length,
    slopeVariance: ((slopeHigh - slopeLow) / (2 * z)) ** 2,
  };
}

/** Days of running from the last day of the trend until its line reaches a limit. Never a promise. */
export interface TimeToLimit {
  readonly days: number;
  readonly earliestDays: number;
  /** Null: may never come. */
  readonly latestDays: number | null;
  readonly confidencePercent: number;
}

/**
 * An exponential that goes on as it did: a straight line on the levels themselves is far too late (23 days for 10,
 * simulated).
 *
 * @param limit in the unit of the days' levels
 * @returns null where the line does not go towards the limit, or has passed it
 */
export function timeToLimit(trend: TrendLine, limit: number): TimeToLimit | null {
  const { line, runningHoursNow, confidencePercent } = trend;
  const target = Math.log(limit);
  const now = line.y + line.slope * (runningHoursNow - line.x);
  if ((target - now) * line.slope <= 0) return null;
  const z = gaussianQuantile(0.5 + confidencePercent / 200);
  const crossing = crossingOf(line, target, z);
  if (crossing === null) return null;
  const days = (hours: number) => Math.max(0, (hours - runningHoursNow) / hoursADay);
  return {
    days: days(crossing.at),
    earliestDays: days(crossing.earliest),
    latestDays: latestOf(crossing, days),
    confidencePercent,
  };
}

function latestOf({ latest }: Crossing, days: (hours: number) => number): number | null {
  return latest === null ? null : days(latest);
}
