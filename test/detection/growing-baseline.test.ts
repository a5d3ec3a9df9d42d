import fc from 'fast-check';
import { expect, it } from 'vitest';
import { baselineOf, baselineRules, type GoodLevel, GrowingBaseline } from '../../src/detection/baseline.ts';
import { dependenceFactor, mannKendall, theilSen } from '../../src/signal/rank-trend.ts';
import {
  deviationOfSorted,
  madToDeviation,
  median,
  medianAbsoluteDeviation,
  medianOfSorted,
  quantile,
} from '../../src/signal/statistics.ts';

const seed = 20261201;

/** What the rules say, reckoned from all readings each time. */
function plainBaseline(levels: readonly GoodLevel[], expectedADay: number) {
  const days = [...new Set(levels.map(({ day }) => day))].map((day) =>
    levels.filter((one) => one.day === day),
  );
  const usual = quantile(
    days.map((day) => day.length),
    0.9,
  );
  const least = Math.max(1, Math.ceil(baselineRules.leastOfDay * Math.min(expectedADay, usual)));
  const running = days.filter((day) => day.length >= least).slice(0, baselineRules.refinedDays);
  const logs = running.flat().map(({ level }) => Math.log(level));
  const dayLogs = running.map((day) => Math.log(median(day.map(({ level }) => level))));
  return {
    runningDays: running.length,
    recordings: logs.length,
    fromMs: running[0]?.[0]?.usedMs ?? null,
    toMs: running.at(-1)?.at(-1)?.usedMs ?? null,
    medianLog: logs.length === 0 ? null : median(logs),
    deviation: madToDeviation * medianAbsoluteDeviation(logs),
    rose: rose(dayLogs),
  };
}

function rose(dayLogs: readonly number[]): boolean {
  if (dayLogs.length < baselineRules.provisionalDays) return false;
  const at = dayLogs.map((_, day) => day);
  const line = theilSen(at, dayLogs, 1);
  if (line === null || Math.exp(line.slope * (dayLogs.length - 1)) < baselineRules.growth) return false;
  const beside = dayLogs.map((log, day) => log - line.intercept - line.slope * day);
  return mannKendall(dayLogs, dependenceFactor(beside)).p < baselineRules.significance;
}

const days = fc.record({
  counts: fc.array(fc.oneof({ weight: 4, arbitrary: fc.constant(8) }, fc.integer({ min: 0, max: 12 })), {
    minLength: 3,
    maxLength: 70,
    size: 'max',
  }),
  growth: fc.constantFrom(0, -0.01, 0.01, 0.02, 0.05),
  scatter: fc.array(fc.double({ min: 0.8, max: 1.25, noNaN: true }), { minLength: 5, maxLength: 97 }),
});

it('is day by day what all readings together give', () => {
  let [refused, counted] = [0, 0];
  fc.assert(
    fc.property(days, fc.integer({ min: 1, max: 24 }), ({ counts, growth, scatter }, expectedADay) => {
      const levels = counts.flatMap((count, day) =>
        Array.from({ length: count }, (_, n) => ({
          usedMs: (24 * day + n) * 3_600_000,
          day,
          level: (scatter[(13 * day + n) % scatter.length] as number) * Math.exp(growth * day),
        })),
      );
      const growing = new GrowingBaseline({ expectedADay, zoneC: null, confirmed: null });
      levels.forEach((level, n) => {
        growing.add(level);
        if (n % 17 !== 0 && n !== levels.length - 1) return;
        const { spreadLog, state, refused: why, confirmed: _, ...now } = growing.now();
        const { deviation, rose: isRefused, ...plain } = plainBaseline(levels.slice(0, n + 1), expectedADay);
        expect(now).toEqual(plain);
        expect(state === 'refused').toBe(isRefused);
        expect(why !== null).toBe(isRefused);
        if (plain.runningDays >= 30) expect(spreadLog).toBe(deviation);
        if (isRefused) refused++;
        counted++;
      });
      expect(growing.now()).toEqual(baselineOf({ levels, expectedADay, zoneC: null, confirmed: null }));
    }),
    { seed, numRuns: 60 },
  );
  expect(refused).toBeGreaterThan(20);
  expect(counted).toBeGreaterThan(500);
});

it('has medians of ascending values, and of distances from them, as of any values', () => {
  const values = fc.array(
    fc.oneof(fc.integer({ min: -3, max: 3 }), fc.double({ min: -1, max: 1, noNaN: true })),
    {
      minLength: 1,
      maxLength: 40,
    },
  );
  fc.assert(
    fc.property(values, (some) => {
      const sorted = Float64Array.from(some).sort();
      expect(medianOfSorted(sorted)).toBe(median(some) + 0);
      expect(deviationOfSorted(sorted, median(some))).toBe(medianAbsoluteDeviation(some));
    }),
    { seed, numRuns: 500 },
  );
  expect(medianOfSorted([])).toBeNaN();
  expect(deviationOfSorted([], 0)).toBeNaN();
});
