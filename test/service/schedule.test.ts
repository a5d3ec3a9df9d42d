import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { instantsOf, localDate, localTime } from '../../src/config/local-time.ts';
import { dailyDue } from '../../src/service/schedule.ts';

const hour = 3_600_000;
const at = (text: string) => Date.parse(text);

describe('the morning summary is due once a local date', () => {
  const dublin = {
    timeZone: 'Europe/Dublin',
    at: { hour: 6, minute: 30 },
    sinceMs: at('2026-01-01T00:00:00Z'),
  };

  it('is not due before its time and due from it on', () => {
    expect(dailyDue({ ...dublin, wallMs: at('2026-03-10T06:29:59Z'), lastDone: '2026-03-09' })).toBeNull();
    expect(dailyDue({ ...dublin, wallMs: at('2026-03-10T06:30:00Z'), lastDone: '2026-03-09' })).toBe(
      '2026-03-10',
    );
    expect(dailyDue({ ...dublin, wallMs: at('2026-03-10T23:30:00Z'), lastDone: '2026-03-10' })).toBeNull();
  });

  it('is caught up after a pause, for today only', () => {
    expect(dailyDue({ ...dublin, wallMs: at('2026-03-20T15:00:00Z'), lastDone: '2026-03-09' })).toBe(
      '2026-03-20',
    );
  });

  it('is due on the day a clock change skips its time of day', () => {
    // Europe/Dublin goes from 00:59:59 to 02:00 on 29 March 2026.
    const skipped = { ...dublin, at: { hour: 1, minute: 30 }, lastDone: '2026-03-28' };
    expect(dailyDue({ ...skipped, wallMs: at('2026-03-29T00:59:59Z') })).toBeNull();
    expect(dailyDue({ ...skipped, wallMs: at('2026-03-29T01:00:00Z') })).toBe('2026-03-29');
  });

  it('does not come twice in the hour that a clock change repeats', () => {
    // Europe/Dublin repeats 01:00 to 01:59 on 25 October 2026.
    const repeated = { ...dublin, at: { hour: 1, minute: 30 } };
    expect(dailyDue({ ...repeated, wallMs: at('2026-10-25T00:30:00Z'), lastDone: '2026-10-24' })).toBe(
      '2026-10-25',
    );
    expect(dailyDue({ ...repeated, wallMs: at('2026-10-25T01:30:00Z'), lastDone: '2026-10-25' })).toBeNull();
  });

  it('does not come at once on the day of installation when its time had passed', () => {
    const fresh = { ...dublin, lastDone: null, sinceMs: at('2026-03-10T09:00:00Z') };
    expect(dailyDue({ ...fresh, wallMs: at('2026-03-10T09:01:00Z') })).toBeNull();
    expect(dailyDue({ ...fresh, wallMs: at('2026-03-11T06:30:00Z') })).toBe('2026-03-11');
  });

  it('does not repeat a date when somebody sets the clock back a day', () => {
    expect(dailyDue({ ...dublin, wallMs: at('2026-03-09T07:00:00Z'), lastDone: '2026-03-10' })).toBeNull();
  });
});

describe('local time', () => {
  it('names no instant for a skipped reading and two for a repeated one', () => {
    expect(instantsOf(at('2026-03-29T01:30:00Z'), 'Europe/Dublin')).toEqual([]);
    expect(instantsOf(at('2026-10-25T01:30:00Z'), 'Europe/Dublin')).toEqual([
      at('2026-10-25T00:30:00Z'),
      at('2026-10-25T01:30:00Z'),
    ]);
    expect(instantsOf(at('2026-07-01T12:00:00Z'), 'America/New_York')).toEqual([at('2026-07-01T16:00:00Z')]);
  });

  it('an instant is among the instants of its own reading, in any zone', () => {
    const seed = 20261201;
    fc.assert(
      fc.property(
        fc.integer({ min: at('2000-01-01T00:00:00Z') / 1000, max: at('2040-01-01T00:00:00Z') / 1000 }),
        fc.constantFrom(
          'Europe/Dublin',
          'America/New_York',
          'Australia/Lord_Howe',
          'Asia/Kolkata',
          'UTC',
          'Pacific/Apia',
        ),
        (seconds, zone) => {
          const t = localTime(seconds * 1000, zone);
          const reading = Date.UTC(t.year, t.month - 1, t.day, t.hour, t.minute, t.second);
          expect(instantsOf(reading, zone)).toContain(seconds * 1000);
        },
      ),
      { seed, numRuns: 500 },
    );
  });

  it('the local date turns at local midnight', () => {
    expect(localDate(at('2026-06-30T23:30:00Z'), 'Europe/Dublin')).toBe('2026-07-01');
    expect(localDate(at('2026-06-30T23:30:00Z') - hour, 'Europe/Dublin')).toBe('2026-06-30');
  });
});
