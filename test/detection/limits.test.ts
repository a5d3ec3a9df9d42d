import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Limit } from '../../src/config/site.ts';
import type { Condition } from '../../src/detection/alarm.ts';
import { rank } from '../../src/detection/alarm-event.ts';
import { judgeLevel } from '../../src/detection/limits.ts';
import { nothingKnown } from '../../src/detection/thresholds.ts';
import type { BandLevel } from '../../src/manipulation/measurement.ts';
import { levelOf, limitWith } from './site-parts.ts';

const display = { text: 'mm/s', quantity: 'velocity', inSi: 1, detector: 'rms' } as const;
const judged = (level: BandLevel, averages = 31) => ({ level, averages, display, situation: nothingKnown });
const severity = (limit: Limit, level: number, present: Condition = 'normal', averages = 31) =>
  judgeLevel(limit, judged(levelOf(level), averages), present)?.severity;

describe('a level against a fixed limit', () => {
  const upper = limitWith({ alert: 2.8, danger: 4.5, deadbandPercent: 10 });
  const lower = limitWith({ side: 'lower', alert: 2, danger: 1, deadbandPercent: 10 });

  it('passes an upper limit when it exceeds it, a lower one when it is under it; equal is not over', () => {
    expect([2.8, 2.8001, 4.5, 4.5001].map((level) => severity(upper, level))).toEqual([
      'normal',
      'alert',
      'alert',
      'danger',
    ]);
    expect([2, 1.9999, 1, 0.9999, 0].map((level) => severity(lower, level))).toEqual([
      'normal',
      'alert',
      'alert',
      'danger',
      'danger',
    ]);
  });

  it('holds what stands until the level has come back by the deadband (OPC 10000-9, B.1.5; ISA-18.2)', () => {
    expect([2.53, 2.51].map((level) => severity(upper, level, 'alert'))).toEqual(['alert', 'normal']);
    expect([4.06, 4.04].map((level) => severity(upper, level, 'danger'))).toEqual(['danger', 'alert']);
    expect([2.19, 2.21].map((level) => severity(lower, level, 'alert'))).toEqual(['alert', 'normal']);
  });

  it('uses no deadband on the way up: an alert that stands does not make danger easier to reach', () => {
    expect(severity(upper, 4.4, 'alert')).toBe('alert');
  });

  it('works with one of the two limits alone', () => {
    expect(severity(limitWith({ danger: null }), 99)).toBe('alert');
    expect(severity(limitWith({ alert: null }), 4)).toBe('normal');
    expect(severity(limitWith({ alert: null }), 5)).toBe('danger');
  });

  it('decides nothing by a level that is no number', () => {
    for (const level of [Number.NaN, Number.POSITIVE_INFINITY])
      expect(severity(upper, level)).toBeUndefined();
  });

  it("takes a clipped level as 'at least': over an upper limit it counts, a lower limit it cannot pass", () => {
    const clipped = (level: number) => levelOf(level, { atLeast: true });
    expect(judgeLevel(upper, judged(clipped(3)), 'normal')?.severity).toBe('alert');
    expect(judgeLevel(lower, judged(clipped(0.5)), 'normal')).toBeNull();
  });

  it('a higher level is never a lower severity, and what stands is never judged lower for standing', () => {
    const level = fc.double({ min: 0, max: 20, noNaN: true });
    const deadbandPercent = fc.integer({ min: 0, max: 50 });
    const present = fc.constantFrom<Condition>('normal', 'alert', 'danger');
    fc.assert(
      fc.property(level, level, deadbandPercent, present, (a, b, deadband, standing) => {
        const limit = limitWith({ deadbandPercent: deadband });
        const of = (x: number, c: Condition) => rank(severity(limit, x, c) ?? null);
        expect(of(Math.max(a, b), standing)).toBeGreaterThanOrEqual(of(Math.min(a, b), standing));
        expect(of(a, standing)).toBeGreaterThanOrEqual(of(a, 'normal'));
      }),
      { seed: 20261201 },
    );
  });
});

describe('a danger that one recording proves', () => {
  const atOnce = (parts: Partial<BandLevel>, averages: number, limit = limitWith()) =>
    judgeLevel(limit, judged(levelOf(5, parts), averages), 'normal')?.dangerAtOnce;

  it('needs five averages, and the level that 80 % of the segments exceed over the danger limit', () => {
    expect(atOnce({ exceededBy80Percent: 4.51 }, 5)).toBe(true);
    expect(atOnce({ exceededBy80Percent: 4.51 }, 4)).toBe(false);
    expect(atOnce({ exceededBy80Percent: 4.5 }, 31)).toBe(false);
    expect(atOnce({ exceededBy80Percent: null }, 31)).toBe(false);
  });

  it('does not exist for an alert, without a danger limit, or on the lower side', () => {
    expect(atOnce({ level: 3, exceededBy80Percent: 2.9 }, 31)).toBe(false);
    expect(atOnce({ exceededBy80Percent: 4.9 }, 31, limitWith({ danger: null }))).toBe(false);
    const lower = limitWith({ side: 'lower', alert: 9, danger: 8 });
    expect(atOnce({ exceededBy80Percent: 9 }, 31, lower)).toBe(false);
  });
});
