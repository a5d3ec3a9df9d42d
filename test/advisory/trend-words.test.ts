/** What people read of a trend: what was, over how long, how sure; what would come, from when to when, never as a promise. */
import { describe, expect, it } from 'vitest';
import { type TrendFacts, trendInShort, trendSentence } from '../../src/advisory/trend-words.ts';
import { usualDisplayUnit } from '../../src/config/units.ts';
import { morning, rising } from './sample-facts.ts';

const mmPerS = usualDisplayUnit('velocity');
const zone = 'Europe/Dublin';
const { trend: line, ahead } = rising;
if (line.kind !== 'rising' || ahead === null) throw new Error('the sample does not rise');

const said = (parts: Partial<TrendFacts>) => trendSentence({ ...rising, ...parts }, mmPerS, zone);
const short = (parts: Partial<TrendFacts>) => trendInShort({ ...rising, ...parts }, mmPerS, zone);
const inDays = (days: number, earliestDays: number, latestDays: number | null) =>
  said({ ahead: { ...ahead, time: { days, earliestDays, latestDays, confidencePercent: 90 } } });

describe('the words of a trend', () => {
  it('say how far a level rose, over which time, and when it would reach its next limit', () => {
    expect(said({})).toBe(
      'rose by 64 % over 30 running days (p < 0.001); if it went on so, it would reach the danger limit (4.5 mm/s r.m.s.) ' +
        'in about 9 days of running, between 6 and 16 (90 %). A projection, not a promise.',
    );
    expect(short({})).toBe(
      'rose by 64 % over 30 running days, danger (4.5 mm/s r.m.s.) in about 9 days of running, between 6 and 16 (90 %), if it went on so',
    );
    expect(said({ trend: { ...line, p: 0.004, growth: 4.3 }, ahead: null })).toBe(
      'rose to 4.3 times over 30 running days (p < 0.01)',
    );
    expect(said({ trend: { ...line, kind: 'falling', growth: 0.6 }, ahead: null, time: 'calendar' })).toBe(
      'fell by 40 % over 30 days (p < 0.001)',
    );
    expect(short({ ahead: null, condition: 'full-load' })).toBe(
      'rose by 64 % over 30 running days in condition full-load',
    );
  });

  it('leave open what the days do not tell', () => {
    expect(inDays(9, 6, null)).toContain('in about 9 days of running, from 6 on, perhaps never (90 %)');
    expect(inDays(0.4, 0, 1.2)).toContain('in less than a day of running, between now and 1 (90 %)');
    expect(inDays(1.2, 0.6, 2)).toContain('in about 1 day of running, between 1 and 2 (90 %)');
    expect(inDays(140, 100, 230)).toContain(
      'at this rate the danger limit (4.5 mm/s r.m.s.) is more than 90 days of running away. A projection',
    );
  });

  it('tell a step as a step, and no trend across it', () => {
    const step = { kind: 'step', dayMs: Date.UTC(2026, 2, 12, 12), factor: 1.8, daysSince: 4 } as const;
    const words = 'level stepped up by 80 % on Thu 12 Mar 2026, no trend is told across it';
    expect(said({ trend: step, ahead: null })).toBe(words);
    expect(short({ trend: step, ahead: null })).toBe(words);
  });

  it('say that there is none, and of how few days; since a repair', () => {
    expect(said({ trend: { kind: 'none', days: 30, p: 0.4, endsAt: null }, ahead: null })).toBe(
      'no trend over 30 running days',
    );
    expect(said({ trend: { kind: 'none', days: 30, p: 0.4, endsAt: 4.3 }, ahead: null })).toBe(
      'no even trend over 30 running days, but from the first three to the last three of them it rose to 4.3 times',
    );
    const few = { trend: { kind: 'too-few-days', days: 14, needed: 21 }, ahead: null } as const;
    expect(said(few)).toBe('no trend yet: 14 of 21 running days');
    expect(said({ ...few, broken: { kind: 'repair', atMs: morning } })).toBe(
      'no trend yet: 14 of 21 running days since the repair of Tue 1 Dec 2026',
    );
    expect(short(few)).toBeNull();
  });
});
