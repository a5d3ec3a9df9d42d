import { describe, expect, it } from 'vitest';
import type { LimitRule } from '../../src/config/limit-rules.ts';
import type { Limit } from '../../src/config/site.ts';
import type { Condition } from '../../src/detection/alarm.ts';
import type { Baseline } from '../../src/detection/baseline.ts';
import { noBaseline } from '../../src/detection/baseline.ts';
import { judgeLevel } from '../../src/detection/limits.ts';
import { type LimitSituation, nothingKnown, thresholdsOf } from '../../src/detection/thresholds.ts';
import { levelOf, limitWith } from './site-parts.ts';

const display = { text: 'mm/s', quantity: 'velocity', inSi: 1, detector: 'rms' } as const;
/** 2 mm/s usual, a spread of 10 % on logarithms. */
const baseline: Baseline = {
  ...noBaseline,
  state: 'learned',
  runningDays: 40,
  recordings: 960,
  medianLog: Math.log(2),
  spreadLog: 0.1,
};
const known: LimitSituation = { ...nothingKnown, baseline };

const ruled = (rule: LimitRule, more: Partial<Limit> = {}) =>
  limitWith({ alert: null, danger: null, rule, ...more });

function at(limit: Limit, level: number, situation: LimitSituation = known) {
  const found = thresholdsOf(limit, level, situation, display);
  if ('unknown' in found) throw new Error(found.unknown);
  return found;
}

function unknown(limit: Limit, situation: LimitSituation): string | null {
  const found = thresholdsOf(limit, 1, situation, display);
  return 'unknown' in found ? found.unknown : null;
}

describe('a limit that is learned', () => {
  it('stands at multiples of what is usual, and says so', () => {
    const limit = ruled({ by: 'baseline', alert: 2.5, danger: 4 });
    expect(at(limit, 3)).toMatchObject({
      alert: 5,
      danger: 8,
      why: { alert: '2.5 times 2 mm/s, the median of 40 running days' },
    });
    expect(at(ruled({ by: 'baseline', alert: 0.5, danger: null }, { side: 'lower' }), 3).alert).toBe(1);
  });

  it('stands so many spreads above what is usual, reckoned on logarithms', () => {
    const limit = ruled({ by: 'spread', alert: 4.5, danger: null }, { danger: 7.1 });
    const found = at(limit, 3);
    expect(found.alert).toBeCloseTo(2 * Math.exp(0.45), 12);
    expect(found.danger).toBe(7.1);
    expect(found.why.alert).toBe('4.5 spreads of 11 % above 2 mm/s, the median of 40 running days');
    expect(at(ruled({ by: 'spread', alert: 2, danger: null }, { side: 'lower' }), 3).alert).toBeCloseTo(
      2 * Math.exp(-0.2),
      12,
    );
  });

  it('never passes its ceiling; a lower limit has none', () => {
    const ceilings = { alert: { value: 3, why: 'the most that the standard advises' }, danger: null };
    const limit = ruled({ by: 'baseline', alert: 2.5, danger: 4 }, { ceilings });
    expect(at(limit, 3)).toMatchObject({ alert: 3, danger: 8 });
    expect(at(limit, 3).why.alert).toMatch(
      /^the most that the standard advises, in place of 5 mm\/s \(2\.5 times/,
    );
    const lower = ruled({ by: 'baseline', alert: 0.9, danger: null }, { side: 'lower', ceilings });
    expect(at(lower, 3).alert).toBe(1.8);
  });

  it('tells a change up and down alike', () => {
    const limit = ruled({ by: 'change', alert: 0.7 });
    const judge = (level: number) =>
      judgeLevel(limit, { level: levelOf(level), averages: 31, display, situation: known }, 'normal')
        ?.severity;
    expect([1.2, 1.31, 2, 2.69, 2.71].map(judge)).toEqual(['alert', 'normal', 'normal', 'normal', 'alert']);
    expect(at(limit, 1.2)).toMatchObject({ side: 'lower', alert: expect.closeTo(1.3, 12) });
  });

  it('cannot be reckoned without a usable baseline, and says why', () => {
    const limit = ruled({ by: 'spread', alert: 4.5, danger: null });
    expect(unknown(limit, nothingKnown)).toBe('no baseline yet: 0 of 7 running days');
    expect(unknown(limit, { ...known, baseline: { ...baseline, state: 'learning', runningDays: 3 } })).toBe(
      'no baseline yet: 3 of 7 running days',
    );
    const refused: Baseline = { ...baseline, state: 'refused', refused: 'it lies in zone C or D' };
    expect(unknown(limit, { ...known, baseline: refused })).toBe(
      'the baseline is refused: it lies in zone C or D',
    );
  });

  it('counts by the level that the site gave beside it while what is learned is not known', () => {
    const limit = ruled({ by: 'spread', alert: 4.5, danger: null }, { danger: 7.1 });
    const refused: Baseline = { ...baseline, state: 'refused', refused: 'it lies in zone C or D' };
    const judge = (level: number, present: Condition, own = limit) => {
      const judged = {
        level: levelOf(level),
        averages: 31,
        display,
        situation: { ...known, baseline: refused },
      };
      return judgeLevel(own, judged, present)?.severity;
    };
    expect([7, 7.2].map((level) => judge(level, 'normal'))).toEqual(['normal', 'danger']);
    expect(at(limit, 3, nothingKnown)).toMatchObject({
      alert: null,
      danger: 7.1,
      missing: { severity: 'alert', why: 'no baseline yet: 0 of 7 running days' },
    });
    // What stands does not come back past a value that nobody knows.
    expect([2, 7.2].map((level) => judge(level, 'alert'))).toEqual(['alert', 'danger']);
    expect([2, 6.6].map((level) => judge(level, 'danger'))).toEqual(['alert', 'danger']);
    const dangerLearned = ruled({ by: 'baseline', alert: null, danger: 4 }, { alert: 3 });
    expect([2, 3.1].map((level) => judge(level, 'normal', dangerLearned))).toEqual(['normal', 'alert']);
    expect([2, 3.1].map((level) => judge(level, 'danger', dangerLearned))).toEqual(['normal', 'danger']);
  });

  it('is marked where the baseline is provisional, or stands by the word of a person', () => {
    const limit = ruled({ by: 'spread', alert: 4.5, danger: null });
    const provisional: Baseline = { ...baseline, state: 'provisional' };
    expect(at(limit, 3, { ...known, baseline: provisional }).provisional).toBe(true);
    const confirmed = { ...baseline, confirmed: { by: 'M. Example', comment: 'as delivered' } };
    expect(at(limit, 3, { ...known, baseline: confirmed }).confirmedBy).toBe('M. Example');
  });
});

describe('a limit on growth', () => {
  const day = 86_400_000;
  const limit = ruled({ by: 'rate', overMs: 7 * day, alert: 1.5, danger: null });
  const past = (growthAWeek: number, days = 7) =>
    Array.from({ length: 24 * days + 1 }, (_, hour) => ({
      usedMs: (hour * day) / 24,
      level: 2 * growthAWeek ** (hour / 168) * (1 + 0.02 * Math.sin(5 * hour)),
    }));

  it('compares the line through the levels now with the line a week before', () => {
    const found = at(limit, 3, { ...nothingKnown, past: past(1.6) });
    expect(found.value).toBeCloseTo(3.2, 1);
    expect(found.alert).toBeCloseTo(3, 1);
    expect(found.why.alert).toMatch(/^1\.5 times 2(\.\d+)? mm\/s, its line 7 d before$/);
    const judge = (growth: number) =>
      judgeLevel(
        limit,
        { level: levelOf(3), averages: 31, display, situation: { ...nothingKnown, past: past(growth) } },
        'normal',
      )?.severity;
    expect([1, 1.4, 1.6].map(judge)).toEqual(['normal', 'normal', 'alert']);
  });

  it('is not moved by a line that may as well be level', () => {
    const scattered = past(1).map((one, n) => ({ ...one, level: n % 8 === 0 ? 4 * one.level : one.level }));
    expect(at(limit, 3, { ...nothingKnown, past: scattered }).value).toBeLessThan(3);
  });

  it('needs eight levels over at least half of its time', () => {
    expect(unknown(limit, { ...nothingKnown, past: past(2).slice(-7) })).toContain('needs 8 levels');
    expect(unknown(limit, { ...nothingKnown, past: past(2, 3) })).toContain('less than half');
  });
});

describe('a limit over speed or load', () => {
  const limit = ruled({
    by: 'curve',
    over: 'speed',
    values: [
      { at: 10, alert: 1, danger: 2 },
      { at: 20, alert: 2, danger: null },
      { at: 40, alert: 3, danger: 6 },
    ],
  });

  it('lies on straight lines between its values; beyond its ends the last one holds', () => {
    const alerts = [5, 10, 15, 30, 40, 50].map((speedHz) => at(limit, 1, { ...nothingKnown, speedHz }).alert);
    expect(alerts).toEqual([1, 1, 1.5, 2.5, 3, 3]);
    expect(at(limit, 1, { ...nothingKnown, speedHz: 20 }).danger).toBeCloseTo(2 + (4 * 10) / 30, 12);
  });

  it('cannot be read off without a measured speed', () => {
    expect(unknown(limit, nothingKnown)).toBe('the recording has no measured speed');
  });
});

describe('confidence', () => {
  const limit = limitWith({ alert: 2.8, danger: 4.5, confident: true });
  const judge = (level: number, intervalLow: number, present: 'normal' | 'alert' = 'normal') =>
    judgeLevel(
      limit,
      { level: levelOf(level, { intervalLow }), averages: 31, display, situation: nothingKnown },
      present,
    )?.severity;

  it('asks for the whole interval over an alert limit, before it stands', () => {
    expect(judge(3, 2.7)).toBe('normal');
    expect(judge(3, 2.9)).toBe('alert');
    expect(judge(3, 2.7, 'alert')).toBe('alert');
  });

  it('is never asked of a danger', () => {
    expect(judge(5, 2)).toBe('danger');
  });
});
