import { describe, expect, it } from 'vitest';
import { alarmDays, alarmsAYear, foundWithinTenDays, seed } from './limit-figures.ts';

const tell = (what: string, value: number) => process.stdout.write(`${what}: ${value.toFixed(3)}\n`);

/** The figures of limit-figures.test.ts on more points; printed for the record. */
describe(`statistical limits over many years (seed ${seed})`, () => {
  it('alarms a point a year', { timeout: 1_200_000 }, () => {
    const points = 100;
    const plain = alarmsAYear(points, { bands: 12 });
    tell('alarms a point a year, as shipped', plain);
    const knocked = alarmsAYear(points, { bands: 12, knocks: 1 / 200 });
    tell('the same with knocks, one recording in 200', knocked);
    tell('from the first day on (provisional baselines)', alarmsAYear(points, { bands: 12 }, 0));
    tell('a baseline that ends after 30 days', alarmsAYear(points, { bands: 12, baselineDays: 30 }));
    expect(plain).toBeLessThan(1);
    expect(knocked).toBeLessThan(1);
  });

  it('doublings in ten days, alerted within ten days', { timeout: 600_000 }, () => {
    const found = foundWithinTenDays(100, { bands: 12 });
    tell('share of bands', found);
    expect(found).toBeGreaterThanOrEqual(0.95);
  });

  it('knocks at an on-delay of two: no more than chance pairs', { timeout: 600_000 }, () => {
    const [points, bands, days] = [50, 12, 120];
    let raised = 0;
    for (let n = 0; n < points; n++)
      raised += alarmDays(n, { bands, days, k: 20, knocks: 1 / 200, onDelay: 2 }).flat().length;
    // From the seventh day on, pairs of neighbours that are both knocks.
    const chance = points * bands * 24 * (days - 7) * (1 / 200) ** 2;
    tell('alarms', raised);
    tell('chance pairs', chance);
    expect(raised).toBeLessThanOrEqual(chance + 4 * Math.sqrt(chance));
  });
});
