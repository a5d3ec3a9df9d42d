import { describe, expect, it } from 'vitest';
import { timeTicks } from '../../../src/advisory/charts/time-ticks.ts';
import { localTime } from '../../../src/config/local-time.ts';

const zone = 'Europe/Dublin';
const day = 86_400_000;
const texts = (from: number, to: number, most: number) => {
  const ticks = timeTicks(from, to, zone, most);
  return ticks.atMs.map(ticks.text);
};

describe('ticks of a time axis', () => {
  it('stand at round hours of the site, its midnights named by their date', () => {
    const from = Date.UTC(2026, 6, 1, 20, 10);
    expect(texts(from, from + 12 * 3_600_000, 8)).toEqual([
      '22:00',
      '2 Jul',
      '02:00',
      '04:00',
      '06:00',
      '08:00',
    ]);
  });

  it('stand at midnights of the site on both sides of a change of its clocks', () => {
    const from = Date.UTC(2026, 2, 27);
    const ticks = timeTicks(from, from + 5 * day, zone, 8);
    for (const at of ticks.atMs) expect(localTime(at, zone)).toMatchObject({ hour: 0, minute: 0 });
    expect(ticks.atMs.map(ticks.text)).toEqual(['27 Mar', '28 Mar', '29 Mar', '30 Mar', '31 Mar', '1 Apr']);
  });

  it('have none at an hour that no clock shows, and one at an hour that comes twice', () => {
    const spring = timeTicks(Date.UTC(2026, 2, 29, 0), Date.UTC(2026, 2, 29, 4), zone, 8);
    expect(spring.atMs.map(spring.text)).toEqual(['29 Mar', '02:00', '03:00', '04:00', '05:00']);
    const autumn = timeTicks(Date.UTC(2026, 9, 24, 23), Date.UTC(2026, 9, 25, 3), zone, 8);
    expect(autumn.atMs.map(autumn.text)).toEqual(['25 Oct', '01:00', '02:00', '03:00']);
  });

  it('stand at first days of months and years over long times, never more than asked for', () => {
    expect(texts(Date.UTC(2025, 10, 3), Date.UTC(2026, 4, 20), 8)).toEqual([
      'Dec',
      '2026',
      'Feb',
      'Mar',
      'Apr',
      'May',
    ]);
    expect(texts(Date.UTC(2016, 4, 1), Date.UTC(2026, 4, 1), 6)).toEqual([
      '2018',
      '2020',
      '2022',
      '2024',
      '2026',
    ]);
    for (const days of [0.1, 1, 9, 40, 200, 900, 5000])
      expect(timeTicks(0, days * day, zone, 7).atMs.length).toBeLessThanOrEqual(8);
  });
});
