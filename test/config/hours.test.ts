import { describe, expect, it } from 'vitest';
import { gapsOfWeek, minutesOfWeek, parseHours } from '../../src/config/hours.ts';
import { parseThenAfter } from '../../src/config/then-after.ts';

const shown = (text: string) => {
  const parsed = parseHours(text);
  if (!parsed.ok) return `refused, ${parsed.instead}`;
  const { days, fromMinute, toMinute } = parsed.value;
  return `${days.map((day) => (day ? 'x' : '-')).join('')} ${fromMinute}..${toMinute}`;
};

describe('hours', () => {
  it.each([
    ['06:00..22:00', 'xxxxxxx 360..1320'],
    ['mon..fri 06:00..18:00', 'xxxxx-- 360..1080'],
    ['sat', '-----x- 0..1440'],
    ['fri..mon 22:00..06:30', 'x---xxx 1320..390'],
    ['sun  00:00..24:00', '------x 0..1440'],
    ['22:00..00:00', 'xxxxxxx 1320..1440'],
  ])('%s are understood', (text, meaning) => {
    expect(shown(text)).toBe(meaning);
  });

  it.each([
    ['06:00-22:00', '06:00..22:00'],
    ['6-22', '06:00..22:00'],
    ['6:30..22', '06:30..22:00'],
    ['Mon-Fri 6am-6pm', 'mon..fri 06:00..18:00'],
    ['monday to friday, 06:00 to 18:00', 'mon..fri 06:00..18:00'],
    ['Sat', 'sat'],
    ['mom..fri 06:00..18:00', 'mon..fri 06:00..18:00'],
    ['06:00..06:00', null],
    ['sat 00:00..00:00', 'sat'],
    ['25:00..26:00', null],
    ['06:00', null],
    ['always', null],
    ['', null],
  ])('%s are refused, with what was meant', (text, instead) => {
    expect(shown(text)).toBe(`refused, ${instead}`);
  });

  it('leave gaps in a week', () => {
    const week = (...texts: string[]) => {
      const covered = new Uint8Array(7 * 1440);
      for (const text of texts) {
        const parsed = parseHours(text);
        if (!parsed.ok) throw new Error(parsed.what);
        minutesOfWeek(parsed.value).forEach((within, minute) => {
          if (within === 1) covered[minute] = 1;
        });
      }
      return gapsOfWeek(covered);
    };
    expect(week('mon..fri 00:00..24:00')).toEqual(['sat 00:00 to mon 00:00']);
    expect(week('06:00..22:00', '22:00..06:00')).toEqual([]);
    expect(week('sun 22:00..06:00')).toEqual(['mon 06:00 to sun 22:00']);
    expect(week('mon 06:00..18:00', 'tue 06:00..18:00')).toEqual([
      'mon 18:00 to tue 06:00',
      'tue 18:00 to mon 06:00',
    ]);
  });
});

it.each([
  ['2 reminders', { reminders: 2 }],
  ['1 reminder', { reminders: 1 }],
  ['8 h', { ms: 28_800_000 }],
])('then_after %s', (text, meaning) => {
  const parsed = parseThenAfter(text);
  expect(parsed.ok ? parsed.value : parsed).toEqual(meaning);
});

it.each([
  ['2', '2 reminders'],
  ['0 reminders', null],
  ['11 reminders', null],
  ['1 min', null],
])('then_after %s is refused', (text, instead) => {
  const parsed = parseThenAfter(text);
  expect(parsed.ok ? parsed.value : parsed.instead).toBe(instead);
});
