import { type Trend, timeToLimit, trendOf } from '../../src/prognosis/trend.ts';
import { dayLevels, plantLogLevels } from './plant-levels.ts';

export const seed = 20261201;
const bands = 12;

/** What is said of the bands of so many points after 30 days. */
export function trendsOf(points: number, course: (days: number) => number): Trend[] {
  return Array.from({ length: points }, (_, n) => plantLogLevels(seed + n, { bands, days: 30, course }))
    .flat()
    .map((logs) => trendOf(dayLevels(logs)));
}

export function share(trends: readonly Trend[], kind: Trend['kind']): number {
  return trends.filter((trend) => trend.kind === kind).length / trends.length;
}

/** Of the rising ones, how many intervals of the time to a limit of twice the level hold the true time. */
export function coverage(points: number, doublingDays: number): { share: number; told: number } {
  const course = (days: number) => (days * Math.LN2) / doublingDays;
  // The levels' days end in the middle of the last one.
  const limit = 2 * Math.exp(course(29.5));
  let [told, held] = [0, 0];
  for (const trend of trendsOf(points, course)) {
    if (trend.kind !== 'rising') continue;
    const time = timeToLimit(trend, limit);
    if (time === null) continue;
    told++;
    if (time.earliestDays <= doublingDays && (time.latestDays ?? 1e9) >= doublingDays) held++;
  }
  return { share: held / told, told };
}
