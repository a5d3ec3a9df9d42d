import { describe, expect, it } from 'vitest';
import { alarmDays, alarmsAYear, foundWithinTenDays, seed } from './limit-figures.ts';

describe(`statistical limits on twelve bands a point, hourly (seed ${seed})`, () => {
  it('give less than one alarm a point a year, single knocks of ten times the level included', () => {
    expect(alarmsAYear(5, { bands: 12, knocks: 1 / 200 })).toBeLessThan(1);
  });

  it('alert a doubling in ten days within ten days in 95 of 100 bands', () => {
    expect(foundWithinTenDays(10, { bands: 12 })).toBeGreaterThanOrEqual(0.95);
  });

  it('raise nothing on single knocks at an on-delay of three recordings', () => {
    // A tenth of the spread: whatever is raised now, knocks raised it.
    const quiet = { bands: 4, days: 120, k: 20, knocks: 1 / 200 };
    expect(alarmDays(1, { ...quiet, onDelay: 3 }).flat()).toEqual([]);
    expect(alarmDays(1, { ...quiet, onDelay: 1 }).flat().length).toBeGreaterThan(10);
  });
});
