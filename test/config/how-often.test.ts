import { expect, it } from 'vitest';
import { type HowOften, parseHowOften, printHowOften, timesWithin } from '../../src/config/how-often.ts';
import { complaints, siteOf } from './site-parts.ts';

const day = 86_400_000;

it.each<[string, HowOften]>([
  ['5 a week', { times: 5, per: 'week' }],
  ['1 a month', { times: 1, per: 'month' }],
  ['0.5 per day', { times: 0.5, per: 'day' }],
  [' 2/year ', { times: 2, per: 'year' }],
  ['1 an year', { times: 1, per: 'year' }],
])('understands %s', (text, value) => {
  expect(parseHowOften(text)).toEqual({ ok: true, value });
});

it('says what would be right of a bare number', () => {
  expect(parseHowOften('5')).toMatchObject({ ok: false, instead: '5 a week' });
  for (const wrong of ['weekly', '5 a fortnight', '-1 a week', '20000 a day', ''])
    expect(parseHowOften(wrong)).toMatchObject({ ok: false, instead: null });
});

it('counts times within any time, by years of 365.25 days', () => {
  expect(timesWithin({ times: 5, per: 'week' }, 14 * day)).toBe(10);
  expect(timesWithin({ times: 1, per: 'month' }, 365.25 * day)).toBeCloseTo(12, 9);
  expect(printHowOften({ times: 1, per: 'month' })).toBe('1 a month');
});

const site = (top: string) => `site: Larkfen Waterworks
time_zone: Europe/Dublin
${top}
folders:
  drop: ./drop
  data: ./data
recordings:
  files: <machine>_<any>.wav
  samples_in: mm/s
machines:
  - id: pump-1
    points:
      - id: de-v
        channel: 1
        quantity: velocity
        bands:
          - id: overall
            from: 10 Hz
            to: 1000 Hz
`;

it('reads the budget of a site, and refuses one without a time', () => {
  expect(siteOf(site('alarm_budget: 2 a day')).alarmBudget).toEqual({ times: 2, per: 'day' });
  expect(complaints(site('alarm_budget: 5'))[0]).toContain('5 a week');
});
