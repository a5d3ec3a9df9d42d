import { describe, expect, it } from 'vitest';
import { coverage, seed, share, trendsOf } from './trend-figures.ts';

/** The figures of trend.test.ts on ten times as many bands; printed for the record. */
describe('trends over many mornings', () => {
  it(`trendless bands (seed ${seed})`, () => {
    const trends = trendsOf(2000, () => 0);
    const claims = (kind: 'rising' | 'falling' | 'step') => 2400 * share(trends, kind);
    process.stdout.write(
      `in 2,400 trendless bands: rising ${claims('rising').toFixed(2)}, falling ${claims('falling').toFixed(2)}, steps ${claims('step').toFixed(2)}\n`,
    );
    expect(claims('rising')).toBeLessThanOrEqual(2);
  });

  it.each([
    ['a doubling in ten days', (days: number) => (days * Math.LN2) / 10],
    ['a doubling in thirty days', (days: number) => (days * Math.LN2) / 30],
    ['half as much again in thirty days', (days: number) => (days * Math.log(1.5)) / 30],
    ['a step to twice the level on day 15', (days: number) => (days < 15 ? 0 : Math.LN2)],
    ['a doubling in ten days since day 20', (days: number) => (Math.max(0, days - 20) * Math.LN2) / 10],
  ])('%s', (what, course) => {
    const trends = trendsOf(100, course);
    const shares = (['rising', 'step', 'none'] as const).map(
      (kind) => `${kind} ${(100 * share(trends, kind)).toFixed(1)} %`,
    );
    process.stdout.write(`${what}: ${shares.join(', ')}\n`);
    expect(trends).toHaveLength(1200);
  });

  it.each([10, 30])('the interval of 90 percent, doubling in %d days', (doublingDays) => {
    const { share: held, told } = coverage(200, doublingDays);
    process.stdout.write(`doubling in ${doublingDays} days: ${(100 * held).toFixed(1)} % of ${told}\n`);
    expect(held).toBeGreaterThan(0.85);
  });
});
