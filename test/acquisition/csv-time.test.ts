import fc from 'fast-check';
import { expect, test } from 'vitest';
import { writtenDigits } from '../../src/acquisition/csv-number.ts';
import {
  type Instant,
  readInstant,
  readPlainInstant,
  timeHeadingOf,
} from '../../src/acquisition/csv-time.ts';
import { type TimeStepsResult, timeSteps } from '../../src/acquisition/csv-time-steps.ts';

const blank = (): Instant => ({ seconds: 0, fraction: 0, fractionDigits: 0, zoned: false });

function instant(text: string): { ms: number; zoned: boolean } | null {
  const into = blank();
  return readInstant(text, into)
    ? { ms: into.seconds * 1000 + into.fraction * 1000, zoned: into.zoned }
    : null;
}

test('date-times with zone, offset, or neither', () => {
  const noon = Date.UTC(2026, 2, 1, 12);
  for (const text of [
    '2026-03-01T12:00:00',
    '2026-03-01 12:00',
    '2026/03/01 12:00:00.000',
    '01.03.2026 12:00:00',
  ]) {
    expect(instant(text)).toEqual({ ms: noon, zoned: false });
  }
  for (const text of [
    '2026-03-01T12:00:00Z',
    '2026-03-01T13:00:00+01:00',
    '2026-03-01 07:30:00-0430',
    '2026-03-01T14:00+02',
  ]) {
    expect(instant(text)).toEqual({ ms: noon, zoned: true });
  }
  expect(instant('2026-03-01T12:00:00,250')).toEqual({ ms: noon + 250, zoned: false });
});

test('impossible or ambiguous dates are not read', () => {
  const texts =
    '2026-02-29T00:00:00|2026-13-01T00:00:00|2026-03-01T24:00:00|2026-03-01T12:60:00|03/04/2026 12:00:00|2026-03-01|' +
    '12:00:00|2026-03-01T12:00:00+15:00|2026-03-01T12:00:00 CET|1969-12-31T00:00:00|2026-03-01T12:00:00.|20260301T120000';
  for (const text of texts.split('|')) {
    expect(instant(text)).toBeNull();
    const bytes = new TextEncoder().encode(text);
    expect(readPlainInstant(bytes, 0, bytes.length, blank())).toBe(false);
  }
});

test('the fast reading of the common form agrees with the thorough one', () => {
  const form = fc
    .tuple(
      fc.date({ min: new Date(0), max: new Date('2199-12-31'), noInvalidDate: true }),
      fc.nat(3),
      fc.boolean(),
      fc.nat(30),
    )
    .map(([date, digits, blankBetween, spoil]) => {
      const text =
        date.toISOString().slice(0, digits === 0 ? 19 : 20 + digits) + (spoil % 2 === 0 ? 'Z' : '');
      const separated = blankBetween ? text.replace('T', ' ') : text;
      return spoil > 20 ? `${separated.slice(0, spoil - 10)}7${separated.slice(spoil - 9)}` : separated;
    });
  fc.assert(
    fc.property(form, (text) => {
      const fast = blank();
      const thorough = blank();
      const bytes = new TextEncoder().encode(text);
      if (readPlainInstant(bytes, 0, bytes.length, fast)) {
        expect(readInstant(text, thorough)).toBe(true);
        expect(fast).toEqual(thorough);
      }
    }),
    { seed: 20261201, numRuns: 3000 },
  );
});

test('headings of a time column and its unit', () => {
  const unit = (heading: string): number | null | undefined => timeHeadingOf(heading)?.unitS;
  for (const heading of [
    'Time (s)',
    'time_s',
    't [s]',
    't/s',
    'Zeit (s)',
    'TIME, s',
    'seconds',
    'Elapsed time [sec]',
  ]) {
    expect(unit(heading)).toBe(1);
  }
  for (const heading of ['time (ms)', 'Zeit [ms]', 't_ms', 'Milliseconds']) expect(unit(heading)).toBe(1e-3);
  expect(unit('Time (µs)')).toBe(1e-6);
  for (const heading of ['time', 'T', 'Zeit', 'date/time', 'Timestamp', 'Time stamp', 'Datum/Uhrzeit']) {
    expect(unit(heading)).toBeNull();
  }
  expect(timeHeadingOf('Time (fortnights)')).toEqual({ unitS: null, unitText: 'fortnights' });
  for (const heading of [
    'acc',
    'temperature',
    'Temp (s)',
    'DE time constant',
    '',
    'x',
    'T1',
    'g',
    'max time',
  ]) {
    expect(timeHeadingOf(heading)).toBeNull();
  }
});

/** Times as a file would hold them. */
function stepsOf(texts: readonly string[]): TimeStepsResult {
  const steps = timeSteps();
  for (const text of texts) {
    writtenDigits(new TextEncoder().encode(text), 0, text.length, 0x2e, steps.digits);
    steps.take(Number(text));
  }
  return steps.result(1);
}

const even = (count: number, rateHz: number, write: (time: number) => string): string[] =>
  Array.from({ length: count }, (_, index) => write(index / rateHz));

test('even sampling is even however few digits its times are written with', () => {
  const writings: ((time: number) => string)[] = [
    (time) => time.toFixed(6),
    (time) => time.toFixed(4),
    (time) => time.toFixed(3),
    (time) => String(time),
    (time) => String(Number(time.toPrecision(6))),
    (time) => time.toExponential(7),
    (time) => (1_767_225_600 + time).toFixed(6),
  ];
  for (const rateHz of [25_600, 12_800, 1000, 1024, 44_100]) {
    for (const write of writings) {
      const { rateHz: measured, deviation } = stepsOf(even(20_000, rateHz, write));
      expect(deviation).toBeLessThan(0.012);
      expect(Math.abs((measured ?? 0) / rateHz - 1)).toBeLessThan(2e-3);
    }
  }
});

test('a row that is missing shows as a step of twice the length, whatever the digits', () => {
  for (const write of [(t: number): string => t.toFixed(6), (t: number): string => t.toFixed(3), String]) {
    const times = even(20_000, 1000, write);
    times.splice(7000, 1);
    expect(stepsOf(times).deviation).toBeCloseTo(1, 3);
  }
  const short = even(12, 1000, (time) => time.toFixed(3));
  short.splice(5, 1);
  expect(stepsOf(short).deviation).toBeCloseTo(0.82, 2);
  const coarse = even(20_000, 25_600, (time) => time.toFixed(6));
  coarse.splice(9000, 3);
  expect(stepsOf(coarse).deviation).toBeGreaterThan(2.9);
});

test('jitter of the logger is measured; time that stands still or runs back has no rate', () => {
  const jitter = Array.from({ length: 1000 }, (_, index) =>
    ((index + 0.2 * Math.sin(index * index)) / 1000).toFixed(9),
  );
  const { rateHz, deviation } = stepsOf(jitter);
  expect(rateHz).toBeCloseTo(1000, 0);
  expect(deviation).toBeGreaterThan(0.3);
  expect(deviation).toBeLessThan(0.4);
  expect(stepsOf(['1', '1', '1'])).toEqual({ rateHz: null, deviation: Number.POSITIVE_INFINITY });
  expect(stepsOf(['3', '2', '1']).rateHz).toBeNull();
  expect(stepsOf(['3'])).toEqual({ rateHz: null, deviation: 0 });
});
