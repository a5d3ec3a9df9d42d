import { describe, expect, it } from 'vitest';
import { type DayLevel, timeToLimit, trendOf } from '../../src/prognosis/trend.ts';
import { coverage, seed, share, trendsOf } from './trend-figures.ts';

const days = (levels: readonly number[], hoursADay = 24): DayLevel[] =>
  levels.map((level, day) => ({ dayMs: day * 86_400_000, runningHours: day * hoursADay, level }));
const growing = (count: number, doublingDays: number, from = 1) =>
  Array.from(
    { length: count },
    (_, day) => from * 2 ** (day / doublingDays) * (1 + 0.02 * Math.sin(7 * day)),
  );

describe('the trend of a level', () => {
  it('is a rise with its rate where a level doubles every ten days', () => {
    const trend = trendOf(days(growing(30, 10)));
    if (trend.kind !== 'rising') throw new Error(trend.kind);
    expect(trend.growthPerDay).toBeCloseTo(2 ** 0.1, 2);
    expect(trend.growth).toBeCloseTo(2 ** 2.9, 0);
    expect(trend.growthPerDayLow).toBeLessThan(2 ** 0.1);
    expect(trend.growthPerDayHigh).toBeGreaterThan(2 ** 0.1);
    expect(trend.p).toBeLessThan(0.01);
  });

  it('looks ten days ahead where ten days are true: the projection is exponential', () => {
    const trend = trendOf(days(growing(30, 10)));
    if (trend.kind !== 'rising') throw new Error(trend.kind);
    const time = timeToLimit(trend, 2 * 2 ** 2.9);
    expect(time?.days).toBeCloseTo(10, 0);
    expect(time?.earliestDays).toBeLessThan(10);
    expect(time?.latestDays).toBeGreaterThan(10);
    // A straight line on the levels of the last ten days says more than 14.
  });

  it('counts the hours that the machine ran, not the days that passed', () => {
    const half = trendOf(days(growing(30, 10), 12));
    if (half.kind !== 'rising') throw new Error(half.kind);
    // Twelve hours a day: what doubled in ten days doubles in five days of running.
    expect(half.growthPerDay).toBeCloseTo(2 ** 0.2, 2);
    expect(timeToLimit(half, 2 * 2 ** 2.9)?.days).toBeCloseTo(5, 0);
  });

  it('says nothing below 21 running days, and needs a growth of 40 %', () => {
    expect(trendOf(days(growing(20, 10)))).toEqual({ kind: 'too-few-days', days: 20, needed: 21 });
    expect(trendOf(days(growing(30, 200))).kind).toBe('none');
    expect(trendOf(days(growing(30, 30))).kind).toBe('rising');
  });

  it('falls where a level falls, and then names no time to an upper limit', () => {
    const trend = trendOf(days(growing(30, -15, 10)));
    if (trend.kind !== 'falling') throw new Error(trend.kind);
    expect(timeToLimit(trend, 20)).toBeNull();
    expect(timeToLimit(trend, 1)?.days).toBeGreaterThan(10);
  });

  it('names no time to a limit that is passed already', () => {
    const trend = trendOf(days(growing(30, 10)));
    if (trend.kind !== 'rising') throw new Error(trend.kind);
    expect(timeToLimit(trend, 2)).toBeNull();
  });

  it('calls a step a step, and begins anew behind it', () => {
    const stepped = growing(40, 1e9).map((level, day) => (day < 25 ? level : 2 * level));
    expect(trendOf(days(stepped))).toMatchObject({ kind: 'step', dayMs: 25 * 86_400_000, daysSince: 15 });
    const repaired = [...growing(15, 10), ...growing(24, 12)].map((level, n) => (n < 15 ? 8 * level : level));
    const after = trendOf(days(repaired));
    expect(after.kind).toBe('rising');
    expect(after).toMatchObject({ days: 24 });
  });

  it('does not call a level that began to grow ten days ago a step', () => {
    const bend = growing(30, 1e9).map((level, day) => level * 2 ** (Math.max(0, day - 20) / 5));
    const trend = trendOf(days(bend));
    if (trend.kind !== 'none') throw new Error(trend.kind);
    // It is said nevertheless that the level moved.
    expect(trend.endsAt).toBeGreaterThan(2.5);
    expect(trendOf(days(growing(30, 1e9)))).toMatchObject({ kind: 'none', endsAt: null });
  });

  it(`claims at most 2 trends in 2,400 bands that have none (seed ${seed})`, () => {
    const trends = trendsOf(200, () => 0);
    expect(trends).toHaveLength(2400);
    expect(trends.filter(({ kind }) => kind === 'rising').length).toBeLessThanOrEqual(2);
    expect(trends.filter(({ kind }) => kind === 'step').length).toBeLessThanOrEqual(2);
  });

  it(`finds a doubling in ten days over the whole window in 90 % (seed ${seed})`, () => {
    expect(
      share(
        trendsOf(25, (time) => (time * Math.LN2) / 10),
        'rising',
      ),
    ).toBeGreaterThanOrEqual(0.9);
  });

  it(`holds the true time to a limit in its 90 % interval about as often as it says (seed ${seed})`, () => {
    const { share: held, told } = coverage(25, 10);
    expect(told).toBeGreaterThan(250);
    expect(held).toBeGreaterThan(0.8);
    expect(held).toBeLessThan(0.97);
  });
});
