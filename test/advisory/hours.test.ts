/**
 * Hours of the week against the clocks of a site: worked examples at the clock changes of Dublin (29 March and 25 October
 * 2026, 01:00 UTC) and a plain twin that looks at every minute.
 */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { endOfWithinMs, isWithin, nextWithinMs } from '../../src/advisory/hours.ts';
import { type Hours, parseHours } from '../../src/config/hours.ts';

const dublin = 'Europe/Dublin';
const minuteMs = 60_000;
const hourMs = 60 * minuteMs;
const dayMs = 24 * hourMs;

function hours(text: string): Hours {
  const parsed = parseHours(text);
  if (!parsed.ok) throw new Error(parsed.what);
  return parsed.value;
}
const at = (...parts: [number, number, number, number, number]) => Date.UTC(...parts);
const shown = (ms: number) => new Date(ms).toISOString().slice(0, 16);

describe('hours', () => {
  it.each([
    // December: Dublin shows UTC. 1 December 2026 is a Tuesday.
    ['06:00..22:00', at(2026, 11, 1, 6, 0), true],
    ['06:00..22:00', at(2026, 11, 1, 21, 59), true],
    ['06:00..22:00', at(2026, 11, 1, 22, 0), false],
    ['mon..fri 06:00..18:00', at(2026, 11, 4, 17, 0), true],
    ['mon..fri 06:00..18:00', at(2026, 11, 5, 12, 0), false],
    ['fri..mon', at(2026, 11, 6, 23, 59), true],
    ['fri..mon', at(2026, 11, 8, 0, 0), false],
    // Past midnight the day is the one on which they begin.
    ['fri 22:00..06:00', at(2026, 11, 5, 5, 59), true],
    ['fri 22:00..06:00', at(2026, 11, 4, 5, 59), false],
    ['22:00..24:00', at(2026, 11, 1, 23, 59), true],
    // July: an hour ahead of UTC.
    ['06:00..22:00', at(2026, 6, 1, 5, 0), true],
    ['06:00..22:00', at(2026, 6, 1, 21, 0), false],
  ])('%s at %i: %s', (text, ms, within) => {
    expect(isWithin(hours(text), ms, dublin)).toBe(within);
  });

  it.each([
    ['06:00..22:00', at(2026, 11, 1, 23, 0), '2026-12-02T06:00'],
    ['mon..fri 06:00..18:00', at(2026, 11, 4, 18, 0), '2026-12-07T06:00'],
    // Spring: 01:00 to 02:00 is skipped. Hours that begin in it begin where it ends, the same instant.
    ['01:30..05:00', at(2026, 2, 29, 0, 30), '2026-03-29T01:00'],
    ['01:15..01:45', at(2026, 2, 29, 0, 30), '2026-03-30T00:15'],
    ['sun 01:15..01:45', at(2026, 2, 29, 0, 30), '2026-04-05T00:15'],
    // Autumn: 01:00 to 02:00 comes twice, from 00:00 and from 01:00 UTC.
    ['01:15..01:45', at(2026, 9, 25, 0, 50), '2026-10-25T01:15'],
    ['22:00..01:30', at(2026, 9, 25, 0, 40), '2026-10-25T01:00'],
  ])('%s come next, seen from %i, at %s UTC', (text, ms, next) => {
    expect(shown(nextWithinMs(hours(text), ms, dublin))).toBe(next);
  });

  it('begin and end where a look at every minute finds it, at any clock change', () => {
    const anyHours = fc
      .record({
        from: fc.constantFrom('', 'mon', 'sat..sun', 'fri..tue'),
        begin: fc.integer({ min: 0, max: 47 }),
        length: fc.integer({ min: 1, max: 47 }),
      })
      .map(({ from, begin, length }) => {
        const time = (half: number) =>
          `${String(Math.floor((half % 48) / 2)).padStart(2, '0')}:${half % 2 === 0 ? '00' : '30'}`;
        return hours(`${from} ${time(begin)}..${time(begin + length)}`.trim());
      });
    const zones = fc.constantFrom(
      [dublin, at(2026, 2, 28, 12, 0)] as const,
      [dublin, at(2026, 9, 24, 12, 0)] as const,
      ['Australia/Lord_Howe', at(2026, 3, 4, 0, 0)] as const,
      ['America/St_Johns', at(2026, 10, 1, 0, 0)] as const,
    );
    fc.assert(
      fc.property(anyHours, zones, fc.integer({ min: 0, max: 24 * 60 }), (one, [zone, begin], minutes) => {
        const ms = begin + minutes * minuteMs;
        const scan = (wanted: boolean) => {
          let found = ms;
          while (isWithin(one, found, zone) !== wanted && found < ms + 8 * dayMs) found += minuteMs;
          return found;
        };
        expect(shown(nextWithinMs(one, ms, zone))).toBe(shown(scan(true)));
        expect(shown(endOfWithinMs(one, ms, zone) ?? 0)).toBe(shown(scan(false)));
      }),
      { seed: 20261201, numRuns: 60 },
    );
  });

  it('that hold always never end', () => {
    expect(endOfWithinMs(hours('mon..sun'), at(2026, 11, 1, 0, 0), dublin)).toBeNull();
    expect(endOfWithinMs(hours('mon'), at(2026, 11, 7, 5, 0), dublin)).toBe(at(2026, 11, 8, 0, 0));
  });
});
