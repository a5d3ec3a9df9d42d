import type { DayLevel } from '../../src/prognosis/trend.ts';
import { median } from '../../src/signal/statistics.ts';
import { seededRandom } from '../signal/random.ts';

/**
 * Hourly levels of a machine that behaves as real ones do: 10 % spread from day to day that forgets within 36 h, half of it
 * common to all bands of a point, and 4 % from hour to hour (common practice; no single source).
 */
export interface PlantModel {
  readonly bands: number;
  readonly days: number;
  /** ln of the level at a time in days, beside the spread. */
  readonly course: (days: number) => number;
}

const spread = 0.1;
const hourly = 0.04;
const forgetsWithinHours = 36;

/** ln of the levels: [band][hour]. */
export function plantLogLevels(seed: number, { bands, days, course }: PlantModel): Float64Array[] {
  const random = seededRandom(seed);
  const keep = Math.exp(-1 / forgetsWithinHours);
  const fresh = Math.sqrt(1 - keep ** 2);
  let common = random.gaussian();
  const own = Array.from({ length: bands }, () => random.gaussian());
  const levels = own.map(() => new Float64Array(24 * days));
  for (let hour = 0; hour < 24 * days; hour++) {
    common = keep * common + fresh * random.gaussian();
    for (let band = 0; band < bands; band++) {
      own[band] = keep * own[band] + fresh * random.gaussian();
      const slow = (spread * (common + own[band])) / Math.SQRT2;
      levels[band][hour] = slow + hourly * random.gaussian() + course(hour / 24);
    }
  }
  return levels;
}

export function dayLevels(logLevels: Float64Array): DayLevel[] {
  return Array.from({ length: logLevels.length / 24 }, (_, day) => ({
    dayMs: day * 86_400_000,
    runningHours: 24 * day + 12,
    level: Math.exp(median(logLevels.subarray(24 * day, 24 * (day + 1)))),
  }));
}
