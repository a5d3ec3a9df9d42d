import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  bearingOf,
  byUrgency,
  changeOf,
  gather,
  type Ranked,
  shareOfAlert,
} from '../../src/advisory/ranking.ts';
import { seededNoise } from '../../src/cli/demo/noise.ts';
import { blower, day, driveH, driveV, fan, hour, morning, overallLimit, pump } from './sample-facts.ts';

const week = (levels: readonly number[]) =>
  levels.map((level, index) => ({ usedMs: morning - 2 * day - index * 12 * hour, level }));
const lastDay = (...levels: number[]) =>
  levels.map((level, index) => ({ usedMs: morning - (index + 1) * hour, level }));

describe('change of a band', () => {
  it('is the median of the last 24 h over the median of the 7 days before', () => {
    const change = changeOf([...week([1, 1.1, 0.9, 1, 1]), ...lastDay(2, 2.2, 1.8)], morning);
    expect(change?.ratio).toBeCloseTo(2, 12);
    expect(change?.worse).toBe(true);
  });

  it('is worse only beyond 3 x 1.4826 MAD of the log levels of the week', () => {
    // Log levels without a slope: their median is 0.1, their median absolute deviation 0.1.
    const before = week([0.1, -0.2, 0.2, 0.1, -0.2, 0.2].map(Math.exp));
    const middle = Math.exp(0.1);
    const edge = Math.exp(3 * 1.4826 * 0.1);
    expect(changeOf([...before, ...lastDay(middle * edge * 0.999)], morning)?.worse).toBe(false);
    expect(changeOf([...before, ...lastDay(middle * edge * 1.001)], morning)?.worse).toBe(true);
    expect(changeOf([...before, ...lastDay(middle)], morning)?.ordinaryRatio).toBeCloseTo(edge, 12);
  });

  it('sees a steady rise: a level that doubles in ten days is worse, one that only scatters is not', () => {
    const noise = seededNoise(20261201);
    const hourly = (growthADay: number) =>
      Array.from({ length: 8 * 24 }, (_, h) => ({
        usedMs: morning - h * 3_600_000,
        level: Math.exp((-growthADay * h) / 24 + 0.05 * noise.gaussian()),
      }));
    expect(changeOf(hourly(Math.LN2 / 10), morning)?.worse).toBe(true);
    expect(changeOf(hourly(0), morning)?.worse).toBe(false);
  });

  it('of a band that a lower limit guards is worse when it falls', () => {
    const levels = [...week([1, 1, 1, 1, 1]), ...lastDay(0.5)];
    expect(changeOf(levels, morning, 'lower')?.worse).toBe(true);
    expect(changeOf(levels, morning)?.worse).toBe(false);
  });

  it('cannot be said without a level in the last day or with fewer than five in the week', () => {
    expect(changeOf(week([1, 1, 1, 1, 1]), morning)).toBeNull();
    expect(changeOf([...week([1, 1, 1, 1]), ...lastDay(2)], morning)).toBeNull();
    expect(changeOf([], morning)).toBeNull();
  });

  it('looks at nothing older than eight days, later than now, or not above zero', () => {
    const levels = [...week([1, 1, 1, 1, 1]), ...lastDay(1)];
    const noise = [
      { usedMs: morning - 8 * day, level: 99 },
      { usedMs: morning + 1, level: 99 },
      { usedMs: morning - hour, level: 0 },
      { usedMs: morning - hour, level: Number.NaN },
    ];
    expect(changeOf([...levels, ...noise], morning)).toEqual(changeOf(levels, morning));
  });

  it('of a series that does not vary is not worse for a difference nobody can see', () => {
    expect(changeOf([...week([1, 1, 1, 1, 1]), ...lastDay(1.001)], morning)?.worse).toBe(false);
  });

  it('does not depend on the order of the levels', () => {
    const levels = [...week([1, 1.2, 0.9, 1, 1.05]), ...lastDay(1.3, 1.4)];
    expect(changeOf([...levels].reverse(), morning)).toEqual(changeOf(levels, morning));
  });
});

describe('order of findings', () => {
  const ranked = fc.record({
    machine: fc.constantFrom(blower, pump, fan, null),
    severity: fc.constantFrom('danger', 'alert', 'trouble', null),
    share: fc.oneof(fc.constant(null), fc.double({ min: 0, noNaN: true })),
  }) as fc.Arbitrary<Ranked>;

  it('is criticality, then severity, then share of the alert limit', () => {
    const a = { machine: blower, severity: 'trouble', share: null } as const;
    const b = { machine: pump, severity: 'danger', share: 3 } as const;
    const c = { machine: pump, severity: 'alert', share: 1.5 } as const;
    const d = { machine: pump, severity: 'alert', share: 1.2 } as const;
    expect([d, c, b, a].sort(byUrgency)).toEqual([a, b, c, d]);
  });

  it('is a total order', () => {
    fc.assert(
      fc.property(ranked, ranked, ranked, (a, b, c) => {
        expect(Math.sign(byUrgency(a, b)) + Math.sign(byUrgency(b, a))).toBe(0);
        if (byUrgency(a, b) <= 0 && byUrgency(b, c) <= 0) expect(byUrgency(a, c)).toBeLessThanOrEqual(0);
      }),
      { seed: 20261201 },
    );
  });
});

describe('share of the alert limit', () => {
  it('is 1 at the limit and more beyond it, for upper and lower limits', () => {
    expect(shareOfAlert(2.8e-3, overallLimit)).toBe(1);
    expect(shareOfAlert(0.5, { ...overallLimit, side: 'lower', alert: 1 })).toBe(2);
  });

  it('is measured by the danger limit where there is no alert limit', () => {
    expect(shareOfAlert(4.5e-3, { ...overallLimit, alert: null })).toBe(1);
  });
});

describe('one bearing', () => {
  it('is the same for all its directions', () => {
    expect(bearingOf(driveH)).toBe('drive end');
    expect(bearingOf(driveV)).toBe('drive end');
    expect(bearingOf({ id: 'x', name: 'Radial (DE) upper', direction: 'radial' })).toBe('DE) upper');
  });

  it('is the point itself where its name does not say the direction', () => {
    expect(bearingOf({ id: 'x', name: 'vertical', direction: 'vertical' })).toBe('vertical');
    expect(bearingOf({ id: 'x', name: 'gearbox', direction: 'axial' })).toBe('gearbox');
    expect(bearingOf({ id: 'x', name: 'end, horizontally', direction: 'horizontal' })).toBe(
      'end, horizontally',
    );
    expect(bearingOf({ id: 'x', name: 'gearbox', direction: null })).toBe('gearbox');
  });

  it('gathers without losing or reordering', () => {
    expect(gather(['a1', 'b1', 'a2'], (text) => text.charAt(0))).toEqual([['a1', 'a2'], ['b1']]);
  });
});
