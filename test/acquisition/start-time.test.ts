import { describe, expect, it } from 'vitest';
import type { StatedStart } from '../../src/acquisition/recording.ts';
import { namePattern, startInName } from '../../src/acquisition/start-in-name.ts';
import {
  instantOfReading,
  parseIsoStart,
  recordingStart,
  type StartQuestion,
} from '../../src/acquisition/start-time.ts';
import { listOf } from './lists.ts';

const utc = (text: string) => Date.parse(`${text}Z`);
const iso = (ms: number) => new Date(ms).toISOString().slice(0, 19);

describe('the start in a name', () => {
  it.each(listOf('starts.txt'))('by %s of %s is %s', (pattern, name, start) => {
    const found = startInName(namePattern(pattern), name);
    expect(found === null ? '-' : iso(found.ms)).toBe(start);
    expect(found?.zoned ?? false).toBe(false);
  });

  it('is looked for in the name only, unless the pattern names a folder', () => {
    const day = '<year><month><day>_<hour><minute>';
    expect(startInName(namePattern(day), '20261103_0930/a.wav')).toBeNull();
    expect(startInName(namePattern(`${day}/`), '20261103_0930/a.wav')).not.toBeNull();
  });

  it('is found in bounded time in a name made to be slow', () => {
    const pattern = namePattern('<year><any><month><any><day><any><hour><any><minute><any>x');
    const before = performance.now();
    expect(startInName(pattern, '1'.repeat(255))).toBeNull();
    expect(performance.now() - before).toBeLessThan(5000);
  });
});

/** Reading of the wall clock, instant(s) it names in UTC, by zone. Dublin's winter time is the "negative summer time" of the zone data. */
const zones: [zone: string, reading: string, first: string, other: string | null, remark: RegExp | null][] = [
  ['Europe/Dublin', '2026-01-15T12:00:00', '2026-01-15T12:00:00', null, null],
  ['Europe/Dublin', '2026-07-15T12:00:00', '2026-07-15T11:00:00', null, null],
  ['Europe/Dublin', '2026-03-29T00:59:59', '2026-03-29T00:59:59', null, null],
  ['Europe/Dublin', '2026-03-29T01:00:00', '2026-03-29T01:00:00', null, /skips/],
  ['Europe/Dublin', '2026-03-29T01:30:00', '2026-03-29T01:30:00', null, /skips/],
  ['Europe/Dublin', '2026-03-29T02:00:00', '2026-03-29T01:00:00', null, null],
  ['Europe/Dublin', '2026-10-25T00:59:59', '2026-10-24T23:59:59', null, null],
  ['Europe/Dublin', '2026-10-25T01:00:00', '2026-10-25T00:00:00', '2026-10-25T01:00:00', /twice/],
  ['Europe/Dublin', '2026-10-25T01:59:59', '2026-10-25T00:59:59', '2026-10-25T01:59:59', /twice/],
  ['Europe/Dublin', '2026-10-25T02:00:00', '2026-10-25T02:00:00', null, null],
  ['America/New_York', '2026-03-08T01:59:59', '2026-03-08T06:59:59', null, null],
  ['America/New_York', '2026-03-08T02:30:00', '2026-03-08T07:30:00', null, /skips/],
  ['America/New_York', '2026-03-08T03:00:00', '2026-03-08T07:00:00', null, null],
  ['America/New_York', '2026-11-01T00:59:59', '2026-11-01T04:59:59', null, null],
  ['America/New_York', '2026-11-01T01:30:00', '2026-11-01T05:30:00', '2026-11-01T06:30:00', /twice/],
  ['America/New_York', '2026-11-01T02:00:00', '2026-11-01T07:00:00', null, null],
  // Half an hour only.
  ['Australia/Lord_Howe', '2026-04-05T01:45:00', '2026-04-04T14:45:00', '2026-04-04T15:15:00', /twice/],
  ['Asia/Kolkata', '2026-04-05T01:45:00', '2026-04-04T20:15:00', null, null],
];

describe("the instant of a logger's reading", () => {
  it.each(zones)('in %s at %s is %s', (zone, reading, first, other, remark) => {
    const found = instantOfReading(utc(reading), { kind: 'site' }, zone, null);
    expect(iso(found.ms)).toBe(first);
    expect(found.otherMs === null ? null : iso(found.otherMs)).toBe(other);
    if (remark === null) expect(found.remark).toBeNull();
    else expect(found.remark).toMatch(remark);
  });

  it.each([
    [{ kind: 'utc' }, '2026-10-25T01:30:00'],
    [{ kind: 'offset', minutes: 60 }, '2026-10-25T00:30:00'],
    [{ kind: 'offset', minutes: -330 }, '2026-10-25T07:00:00'],
  ] as const)('by a clock that keeps %o knows no summer time', (clock, instant) => {
    const found = instantOfReading(utc('2026-10-25T01:30:00'), clock, 'Europe/Dublin', null);
    expect(found).toEqual({ ms: utc(instant), otherMs: null, remark: null });
  });

  it('keeps half-hourly recordings in order through the hour that comes twice', () => {
    const readings = ['00:30', '01:00', '01:30', '01:00', '01:30', '02:00'];
    const starts: number[] = [];
    for (const reading of readings) {
      const wall = utc(`2026-10-25T${reading}:00`);
      starts.push(instantOfReading(wall, { kind: 'site' }, 'Europe/Dublin', starts.at(-1) ?? null).ms);
    }
    expect(starts.map((ms) => iso(ms).slice(11, 16))).toEqual([
      '23:30',
      '00:00',
      '00:30',
      '01:00',
      '01:30',
      '02:00',
    ]);
  });

  it('keeps fractions of a second', () => {
    const found = instantOfReading(utc('2026-07-15T12:00:00') + 250, { kind: 'site' }, 'Europe/Dublin', null);
    expect(found.ms).toBe(utc('2026-07-15T11:00:00') + 250);
  });
});

describe('the start of a recording', () => {
  const stated = (ms: number, origin: StatedStart['origin'], zoned = false): StatedStart => ({
    ms,
    zoned,
    origin,
  });
  const question: StartQuestion = {
    sidecar: stated(1000, 'sidecar', true),
    fileName: stated(2000, 'file-name'),
    header: stated(3000, 'header'),
    modifiedMs: 4000.5,
    clock: { kind: 'offset', minutes: 60 },
    siteZone: 'Europe/Dublin',
    previousMs: null,
  };

  it("goes by the sidecar, then the name, then the header, then the file's time of change", () => {
    const hour = 3_600_000;
    expect(recordingStart(question)).toMatchObject({ statedMs: 1000, origin: 'sidecar' });
    const { fileName, header } = question;
    expect(recordingStart({ ...question, sidecar: null })).toMatchObject({
      statedMs: (fileName?.ms ?? 0) - hour,
      origin: 'file-name',
    });
    expect(recordingStart({ ...question, sidecar: null, fileName: null })).toMatchObject({
      statedMs: (header?.ms ?? 0) - hour,
      origin: 'header',
    });
    expect(recordingStart({ ...question, sidecar: null, fileName: null, header: null })).toEqual({
      statedMs: null,
      startMs: 4001,
      origin: 'modification-time',
      otherMs: null,
      remark: null,
    });
  });

  it.each([
    ['2026-11-03T09:30:00Z', '2026-11-03T09:30:00', true],
    ['2026-11-03T09:30:00+01:00', '2026-11-03T08:30:00', true],
    ['2026-11-03T09:30:00-0530', '2026-11-03T15:00:00', true],
    ['2026-11-03T09:30:00+02', '2026-11-03T07:30:00', true],
    ['2026-11-03 09:30', '2026-11-03T09:30:00', false],
    ['2026-11-03T09:30:00,999', '2026-11-03T09:30:00', false],
  ])('written as %s is understood', (text, instant, zoned) => {
    const found = parseIsoStart(text, 'sidecar');
    expect(found === null ? null : iso(found.ms)).toBe(instant);
    expect(found?.zoned).toBe(zoned);
  });

  it.each([
    '',
    '2026-11-03',
    '3.11.2026 09:30',
    '2026-02-30T00:00:00Z',
    '2026-11-03T25:00:00Z',
    '2026-11-03T09:30:00+25:00',
    '2026-11-03T09:30:00 UTC',
    '1762160000',
  ])('written as "%s" is refused', (text) => {
    expect(parseIsoStart(text, 'sidecar')).toBeNull();
  });
});
