import { describe, expect, test } from 'vitest';
import { bytesSource } from '../../src/acquisition/byte-source.ts';
import { csvReader } from '../../src/acquisition/read-csv.ts';
import { isRefusal, type RecordingHeader } from '../../src/acquisition/recording.ts';
import { readAll, refusalOf, shortReads, type Whole, wholeChannels } from './read-all.ts';

/** Writings of one and the same table first, then headings, time, and what is broken. */

const bytesOf = (text: string): Uint8Array => new TextEncoder().encode(text);
const read = (text: string): Whole => readAll(csvReader, bytesOf(text));
const channels = (text: string): number[][] => wholeChannels(csvReader, bytesOf(text));
const refusal = (text: string): string => refusalOf(csvReader, bytesOf(text))?.reason ?? 'not refused';
function headerOf(text: string): RecordingHeader {
  const header = csvReader.header(bytesSource(bytesOf(text)));
  if (isRefusal(header)) throw new Error(header.reason);
  return header;
}

describe('one table, however it is written', () => {
  const expected = [
    [1.5, -2.25, 1000],
    [-0.5, 3, 0.001],
  ];
  const writings: [string, string][] = [
    ['comma', 'a,b\n1.5,-0.5\n-2.25,3\n1e3,1E-3\n'],
    ['comma and blank', 'a, b\n1.5, -0.5\n-2.25, 3\n1000, .001\n'],
    ['semicolon', 'a;b\n1.5;-0.5\n-2.25;3\n1000;0.001\n'],
    ['semicolon, decimal comma', 'a;b\n1,5;-0,5\n-2,25;3\n1000;0,001\n'],
    ['tab', 'a\tb\n1.5\t-0.5\n-2.25\t3\n1000\t0.001\n'],
    ['tab, decimal comma', 'a\tb\n1,5\t-0,5\n-2,25\t3\n1000\t1,0e-3\n'],
    ['columns of blanks', '     a       b\n  1.5    -0.5\n -2.25    3  \n 1000     0.001\n'],
    ['quoted', '"a","b"\n"1.5","-0.5"\n"-2.25","3"\n"1000","0.001"\n'],
    ['quoted, decimal comma', '"a","b"\n"1,5","-0,5"\n"-2,25","3"\n"1000","0,001"\n'],
    ['CRLF', 'a,b\r\n1.5,-0.5\r\n-2.25,3\r\n1000,0.001\r\n'],
    ['CR', 'a,b\r1.5,-0.5\r-2.25,3\r1000,0.001\r'],
    ['no last line end', 'a,b\n1.5,-0.5\n-2.25,3\n1000,0.001'],
    ['byte-order mark', '\ufeffa,b\n1.5,-0.5\n-2.25,3\n1000,0.001\n'],
    ['blank lines and remarks', '# made up\n\na,b\n1.5,-0.5\n\n# pause\n-2.25,3\n1000,0.001\n\n\n'],
    ['a delimiter behind each row', 'a;b;\n1.5;-0.5;\n-2.25;3;\n1000;0.001;\n'],
    ['a preamble', 'Logger;L5\nSerial number;0012;7\nsep=;\n\na;b\n1.5;-0.5\n-2.25;3\n1000;0.001\n'],
  ];
  test.each(writings)('%s', (_, text) => {
    expect(channels(text)).toEqual(expected);
    const { header, end } = read(text);
    expect(header).toMatchObject({
      format: 'CSV',
      channelNames: ['a', 'b'],
      samples: 'number',
      complete: true,
    });
    expect(header).toMatchObject({ sampleRateHz: null, framesClaimed: null, start: null });
    expect(end).toEqual({ frames: 3, truncated: null, timeStepDeviation: null, measuredRateHz: null });
    expect(readAll(csvReader, shortReads(bytesOf(text), 3)).channels).toEqual(expected);
  });

  test('without headings, also with a byte-order mark, channels have numbers', () => {
    for (const text of ['1.5,-0.5\n-2.25,3\n1000,0.001\n', '\ufeff1.5;-0.5\n-2.25;3\n1000;0.001']) {
      expect(channels(text)).toEqual(expected);
      expect(headerOf(text).channelNames).toEqual(['1', '2']);
    }
  });

  test('one column: a point, a comma under one heading, a comma with a zero behind it', () => {
    expect(channels('1.5\n2.5\n-3\n')).toEqual([[1.5, 2.5, -3]]);
    expect(channels('acc\n1,5\n2,25\n-3,5\n')).toEqual([[1.5, 2.25, -3.5]]);
    expect(channels('"1,5"\n"2,25"\n"-3,5"\n')).toEqual([[1.5, 2.25, -3.5]]);
    expect(channels('1,05\n2,25\n-3,5\n')).toEqual([[1.05, 2.25, -3.5]]);
    expect(channels('a,b\n1,5\n2,25\n')).toEqual([
      [1, 2],
      [5, 25],
    ]);
  });

  test('commas for both purposes are refused, not guessed', () => {
    expect(refusal('a,b\n1,5,2,5\n1,7,2,9\n')).toMatch(
      /^line 2: 4 fields under 2 headings, .*semicolons or decimal points/,
    );
  });

  test('NaN, inf and empty fields are passed on for quality to judge', () => {
    const found = channels('a,b,c\n1,NaN,inf\n2,,-Inf\nnan,5,6\n');
    expect(found).toEqual([
      [1, 2, Number.NaN],
      [Number.NaN, Number.NaN, 5],
      [Number.POSITIVE_INFINITY, Number.NEGATIVE_INFINITY, 6],
    ]);
  });
});

describe('headings and units', () => {
  test('units in brackets, in a row of their own, or none', () => {
    expect(headerOf('t (s),DE [m/s²],NDE (g)\n0,1,2\n1,2,3\n')).toMatchObject({
      channelNames: ['DE', 'NDE'],
      channelUnits: ['m/s²', 'g'],
    });
    expect(headerOf('Time;DE;NDE\ns;m/s2;[mm/s]\n0;1;2\n1;2;3\n')).toMatchObject({
      channelNames: ['DE', 'NDE'],
      channelUnits: ['m/s2', 'mm/s'],
      sampleRateHz: 1,
    });
    expect(headerOf('pump (DE),pump (NDE)\n1,2\n3,4\n')).toMatchObject({
      channelNames: ['pump (DE)', 'pump (NDE)'],
      channelUnits: [null, null],
    });
    expect(headerOf('[g],[g]\n1,2\n3,4\n')).toMatchObject({
      channelNames: ['1', '2'],
      channelUnits: ['g', 'g'],
    });
  });

  test('Windows-1252 headings of older loggers', () => {
    const bytes = Uint8Array.from('Zeit;Geh\u00e4use [m/s\u00b2]\n0,0;1,5\n0,1;2,5\n', (letter) =>
      letter.charCodeAt(0),
    );
    const { header } = readAll(csvReader, bytes);
    expect(header).toMatchObject({ channelNames: ['Gehäuse'], channelUnits: ['m/s²'], sampleRateHz: 10 });
  });

  test('a heading behind a remark sign, an empty one, two equal ones, quoted delimiters', () => {
    expect(headerOf('# time, acc\n0.0, 1\n0.5, 2\n')).toMatchObject({
      channelNames: ['acc'],
      sampleRateHz: 2,
    });
    expect(headerOf('a,,a\n1,2,3\n4,5,6\n').channelNames).toEqual(['a', '2', 'a 2']);
    expect(headerOf('"pump 2, DE";"say ""x"""\n1;2\n3;4\n').channelNames).toEqual(['pump 2, DE', 'say "x"']);
  });

  test('control characters, direction marks and endless headings do not get into names', () => {
    const names = headerOf(`a\u0007\u202eb,${'x'.repeat(500)}\n1,2\n3,4\n`).channelNames;
    expect(names).toEqual(['ab', 'x'.repeat(80)]);
  });
});

describe('time column', () => {
  const rows = (count: number, write: (index: number) => string): string =>
    Array.from({ length: count }, (_, index) => write(index)).join('\n');

  test('the rate is measured over the whole file, steps must be even', () => {
    const text = `Time (ms),acc\n${rows(5000, (index) => `${(index / 2.56).toFixed(4)},${index % 7}`)}`;
    const { header, channels, end } = read(text);
    expect(header.sampleRateHz).toBeCloseTo(2560, 1);
    expect(channels[0].slice(0, 8)).toEqual([0, 1, 2, 3, 4, 5, 6, 0]);
    expect(end).toMatchObject({ frames: 5000, timeStepDeviation: 0 });
    if ('frames' in end) expect(end.measuredRateHz).toBeCloseTo(2560, 4);
  });

  test('a time column in any place; seconds where nothing is said', () => {
    const { header, end } = read(
      `acc;Zeit\n${rows(100, (index) => `1,5;${String(index / 50).replace('.', ',')}`)}`,
    );
    expect(header).toMatchObject({ channelNames: ['acc'] });
    expect(header.sampleRateHz).toBeCloseTo(50, 6);
    expect(end).toMatchObject({ frames: 100 });
  });

  test('a missing row shows as an uneven step', () => {
    const text = `t,acc\n${rows(4000, (index) => `${(index < 3000 ? index : index + 1) / 1000},1`)}`;
    const { end } = read(text);
    if (!('frames' in end)) throw new Error(end.reason);
    expect(end.timeStepDeviation).toBeCloseTo(1, 2);
  });

  test('date-times give the start, with or without a zone', () => {
    const at = (index: number): string => new Date(Date.UTC(2026, 2, 1, 6) + index * 10 + 250).toISOString();
    const zoned = read(`date/time,acc\n${rows(300, (index) => `${at(index)},${index}`)}`);
    expect(zoned.header.start).toEqual({
      ms: Date.UTC(2026, 2, 1, 6, 0, 0, 250),
      zoned: true,
      origin: 'time-column',
    });
    expect(zoned.header.sampleRateHz).toBeCloseTo(100, 9);
    expect(zoned.end).toMatchObject({ frames: 300 });
    const local = read(`${rows(300, (index) => `${at(index).slice(0, 23).replace('T', ' ')};${index},5`)}`);
    expect(local.header.start).toEqual({
      ms: Date.UTC(2026, 2, 1, 6, 0, 0, 250),
      zoned: false,
      origin: 'time-column',
    });
    expect(local.channels[0][1]).toBe(1.5);
  });

  test('seconds and milliseconds since 1970 give the start', () => {
    const seconds = headerOf(`timestamp,acc\n${rows(10, (index) => `${1_772_344_800 + index / 10},1`)}`);
    expect(seconds.start).toEqual({ ms: 1_772_344_800_000, zoned: true, origin: 'time-column' });
    const ms = headerOf(`timestamp,acc\n${rows(10, (index) => `${1_772_344_800_000 + index * 100},1`)}`);
    expect(ms.start).toEqual({ ms: 1_772_344_800_000, zoned: true, origin: 'time-column' });
    expect(ms.sampleRateHz).toBeCloseTo(10, 9);
    expect(headerOf('time,acc\n0,1\n0.1,2\n').start).toBeNull();
  });

  test('a unit of time that is not known is refused, not taken as seconds', () => {
    expect(refusal('Time (fortnights),acc\n0,1\n1,2\n')).toMatch(
      /unit 'fortnights' of the time column is not known/,
    );
    expect(refusal('Time;acc\n[ticks];g\n0;1\n1;2\n')).toMatch(/not known/);
  });

  test('a time column that stands still has no rate, and says so', () => {
    const { header, end } = read('t,acc\n1,1\n1,2\n1,3\n');
    expect(header.sampleRateHz).toBeNull();
    expect(header.remarks).toEqual(['the time column does not run forward']);
    expect(end).toMatchObject({ measuredRateHz: null, timeStepDeviation: Number.POSITIVE_INFINITY });
  });
});

describe('what is broken is damaged, with its line', () => {
  const good = 'a,b\n1,2\n3,4\n5,6\n7,8\n';
  const cases: [string, string, RegExp][] = [
    [
      'too few fields',
      `${good}9\n1,2\n`,
      /^line 6: 1 fields where 2 are expected; .*record or export it again$/,
    ],
    ['too many fields', `${good}9,9,9\n1,2\n`, /^line 6: 3 fields where 2/],
    ['no number', `${good}9,x\n1,2\n`, /^line 6: field 2 is no number/],
    ['thousands separated', `${good}9,1.000.5\n1,2\n`, /^line 6: field 2 is no number/],
    ['an open quote', `${good}9,"5\n1,2\n`, /^line 6: field 2 is no number/],
    ['a date among numbers', `${good}9,2026-03-01T00:00:00\n1,2\n`, /^line 6: a date where a number/],
    ['a time that is missing', 't,a\n1,2\n2,3\n3,4\n,5\n5,6\n', /^line 5: no time in field 1/],
    ['a footer', `${good}End of recording\n`, /^line 6: field 1 is no number/],
    ['a time column alone', 'time\n0\n1\n2\n', /line 2: a time column and no other/],
    [
      'prose',
      'We went up the hill.\nThen down again.\n',
      /no row of numbers in 38 bytes; columns of samples/,
    ],
    ['nothing', '', /no row of numbers in 0 bytes/],
    ['a line that is too long', `${good}${'1'.repeat(70_000)}\n`, /^line 6: longer than 65536 bytes/],
    ['too many columns', `${'1,'.repeat(1500)}1\n${'1,'.repeat(1500)}1\n`, /more than 1024 columns; split/],
    [
      'an endless preamble',
      `${'words only\n'.repeat(7000)}1,2\n`,
      /no row of numbers in the first 65536 bytes/,
    ],
  ];
  test.each(cases)('%s', (_, text, words) => {
    expect(refusal(text)).toMatch(words);
    expect(refusal(text)).not.toMatch(/\n/);
  });

  test('UTF-16 is refused politely', () => {
    const utf16 = Uint8Array.from([0xff, 0xfe, ...Buffer.from('a,b\n1,2\n', 'utf16le')]);
    expect(csvReader.recognise(utf16, 'x.csv')).toBe(true);
    expect(refusalOf(csvReader, utf16)).toEqual({
      refused: 'unsupported',
      reason: 'byte 0: this text is UTF-16; have it written as UTF-8',
    });
  });

  test('line numbers count every line, blank ones, remarks and CRLF too', () => {
    expect(refusal('# x\r\n\r\na;b\r\n1;2\r\n3;4\r\n5;6\r\n# y\r\n\r\n7;q\r\n9;9\r\n')).toMatch(
      /^line 9: field 2/,
    );
  });

  test('rows ahead of the damage are given first', () => {
    const { channels: found, end } = read(`${good}9,x\n1,2\n`);
    expect(found[0]).toEqual([1, 3, 5, 7]);
    expect(end).toMatchObject({ refused: 'damaged' });
  });

  test('a last line cut short is dropped and told', () => {
    for (const cut of ['9', '9,', '9,-', '9,1e']) {
      const { channels: found, end } = read(good + cut);
      expect(found[1]).toEqual([2, 4, 6, 8]);
      expect(end).toMatchObject({ frames: 4, truncated: 'the last line, 6, is cut short: dropped' });
    }
  });

  test('space that was reserved and not written: not complete, truncated where the zeros begin', () => {
    for (const zeros of [100, 70_000, 400_000]) {
      const { header, channels: found, end } = read(good + '\0'.repeat(zeros));
      expect(header).toMatchObject({ complete: false, channelNames: ['a', 'b'] });
      expect(found[0]).toEqual([1, 3, 5, 7]);
      expect(end).toMatchObject({
        frames: 4,
        truncated: expect.stringContaining('zero bytes from line 6 on'),
      });
    }
    expect(headerOf('\0'.repeat(100_000))).toMatchObject({ complete: false, channelNames: [] });
  });

  test('headings alone: not complete, for a logger may only have begun', () => {
    expect(headerOf('Time;acc\ns;g\n')).toMatchObject({ complete: false, sampleRateHz: null });
  });
});

test('a file of many blocks comes whole, whatever the blocks and buffers cut through', () => {
  const count = 150_000;
  const text = Array.from({ length: count }, (_, index) => `${index};${-index},25`).join('\r\n');
  const { channels: found, end, blocks } = read(`x;y\r\n${text}\r\n`);
  expect(end).toMatchObject({ frames: count, truncated: null });
  expect(blocks).toBeGreaterThan(2);
  expect(found[0].every((value, index) => value === index)).toBe(true);
  expect(found[1].every((value, index) => value === (index === 0 ? 0.25 : -(index + 0.25)))).toBe(true);
});
