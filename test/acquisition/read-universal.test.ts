import { describe, expect, test } from 'vitest';
import { bytesSource } from '../../src/acquisition/byte-source.ts';
import { universalReader } from '../../src/acquisition/read-universal.ts';
import { readerFor } from '../../src/acquisition/readers.ts';
import { isRefusal, type RecordingHeader } from '../../src/acquisition/recording.ts';
import { readAll, refusalOf, shortReads, wholeChannels } from './read-all.ts';

/** One sine period at 25,600 Hz, as the format's own example has it. */
const sample = `    -1
    58
NONE
NONE
01-MAY-24 12:00:00
NONE
NONE
    1         0    0         0 NONE               1   3 NONE               0   0
         4         8         1  0.00000E+00  3.90625E-05  0.00000E+00
        17    0    0    0 Time                 s                   
        12    1    0    0 Acceleration         m/s2                
         0    0    0    0 NONE                 NONE                
         0    0    0    0 NONE                 NONE                
  0.000000000000E+00  7.071067811865E-01  1.000000000000E+00  7.071067811865E-01
  1.224646799147E-16 -7.071067811865E-01 -1.000000000000E+00 -7.071067811865E-01
    -1
`;
const half = Number('7.071067811865E-01');
const sine = [0, half, 1, half, 1.224646799147e-16, -half, -1, -half];

const bytesOf = (text: string) => Uint8Array.from(text, (letter) => letter.charCodeAt(0));

function headerOf(text: string): RecordingHeader {
  const header = universalReader.header(bytesSource(bytesOf(text)));
  if (isRefusal(header)) throw new Error(header.reason);
  return header;
}

/** Exchanges a line of the sample, counted from 1. */
function withLine(number: number, line: string): string {
  return sample
    .split('\n')
    .map((one, index) => (index === number - 1 ? line : one))
    .join('\n');
}

const responseLine = (entity: string, node: number, direction: number) =>
  `    1         0    0         0 ${entity.padEnd(10)}${String(node).padStart(10)}${String(direction).padStart(4)} NONE               0   0`;

/** The sample as 58b of doubles. */
function binary(values: readonly number[], { little = true, bytes = 8 * values.length } = {}): Uint8Array {
  const lines = sample.split('\n').slice(0, 13);
  const order = little ? 1 : 2;
  lines[1] = `    58b     ${order}     2          11${String(bytes).padStart(12)}     0     0           0           0`;
  lines[8] = `         4${String(values.length).padStart(10)}         1  0.00000E+00  3.90625E-05  0.00000E+00`;
  const data = new DataView(new ArrayBuffer(8 * values.length));
  for (const [index, value] of values.entries()) data.setFloat64(8 * index, value, little);
  return Uint8Array.from([
    ...bytesOf(`${lines.join('\n')}\n`),
    ...new Uint8Array(data.buffer),
    ...bytesOf('    -1\n'),
  ]);
}

describe('the values', () => {
  test("the format's own example", () => {
    expect(headerOf(sample)).toMatchObject({
      format: 'UFF 58',
      sampleRateHz: 25_600,
      channelNames: ['1 +Z'],
      channelUnits: ['m/s2'],
      samples: 'number',
      framesClaimed: 8,
      complete: true,
      start: { ms: Date.UTC(2024, 4, 1, 12), zoned: false, origin: 'header' },
      remarks: [],
    });
    expect(wholeChannels(universalReader, bytesOf(sample))).toEqual([sine]);
  });

  test('the same behind CR LF, without blanks at line ends, in short reads', () => {
    const variants = [sample.replaceAll('\n', '\r\n'), sample.replace(/ +\n/g, '\n'), `\n${sample}\n\n`];
    for (const text of variants) {
      expect(wholeChannels(universalReader, bytesOf(text))).toEqual([sine]);
      expect(readAll(universalReader, shortReads(bytesOf(text), 7)).channels).toEqual([sine]);
    }
  });

  test('bytes of either order are the same as text, also where they look like lines and ends', () => {
    // The eight bytes '\n    -1\n' as a double.
    const trap = new DataView(bytesOf('\n    -1\n').buffer).getFloat64(0, true);
    const values = [...sine, trap, Number.NaN, -Infinity];
    for (const little of [true, false])
      expect(wholeChannels(universalReader, binary(values, { little }))).toEqual([values]);
  });

  test('numbers that did not fit and words for no number are NaN; an exponent may lack its letter', () => {
    const text = withLine(
      14,
      `********************                 NaN  1.000000000000+100 -2.500000000000D-01`,
    );
    expect(wholeChannels(universalReader, bytesOf(text))[0]?.slice(0, 4)).toEqual([NaN, NaN, 1e100, -0.25]);
  });

  test.each([
    [
      'a word',
      '              missing  7.071067811865E-01  1.000000000000E+00  7.071067811865E-01',
      'value 1 of 8 is no number',
    ],
    [
      'a value too few',
      '  0.000000000000E+00  7.071067811865E-01  1.000000000000E+00',
      'value 4 of 8 is no number',
    ],
    [
      'a blank field',
      '  0.000000000000E+00                      1.000000000000E+00  7.071067811865E-01',
      'value 2 of 8 is no number',
    ],
    ['a value too many', `${'  1.000000000000E+00'.repeat(5)}`, 'more than 4 values in a line'],
    [
      'columns shifted by three',
      '     0.000000000000E+00  7.071067811865E-01  1.000000000000E+00  7.071067811865E-01',
      'value 1 of 8 is no number',
    ],
  ])('are damaged: %s', (_, line, reason) => {
    expect(refusalOf(universalReader, bytesOf(withLine(14, line)))).toMatchObject({
      refused: 'damaged',
      reason: expect.stringContaining(reason),
    });
  });
});

describe('names, units and start', () => {
  const pair = (one: string, other: string) => headerOf(withLine(8, one) + withLine(8, other)).channelNames;

  test('a channel is called by response entity, node and direction', () => {
    expect(pair(responseLine('PUMP', 3, -1), responseLine('PUMP', 3, 6))).toEqual([
      'PUMP 3 -X',
      'PUMP 3 +rotation Z',
    ]);
    expect(pair(responseLine('DE', 0, 0), responseLine('NONE', 12, 2))).toEqual(['DE', '12 +Y']);
  });

  test('by the first line where responses do not tell the channels apart', () => {
    const called = (name: string) => withLine(3, name);
    expect(headerOf(called('left bearing') + called('right bearing')).channelNames).toEqual([
      'left bearing',
      'right bearing',
    ]);
    expect(headerOf(sample + sample).channelNames).toEqual(['1 +Z', '1 +Z 2']);
  });

  test.each([
    ['01-MAY-24 12:00:00', Date.UTC(2024, 4, 1, 12)],
    ['1-Dec-2026  7:30:15.25', Date.UTC(2026, 11, 1, 7, 30, 15, 250)],
    ['31-JAN-99 00:00:00', Date.UTC(1999, 0, 31)],
    ['NONE', null],
    ['29-FEB-23 12:00:00', null],
    ['01-05-24 12:00:00', null],
    ['01-MAI-24 12:00:00', null],
    ['2024-05-01 12:00:00', null],
  ])('the third line %s', (line, ms) => {
    const { start, remarks } = headerOf(withLine(5, line));
    expect(start?.ms ?? null).toBe(ms);
    expect(remarks.length).toBe(ms === null && line !== 'NONE' ? 1 : 0);
  });

  test('data sets that state different starts state none', () => {
    const { start, remarks } = headerOf(sample + withLine(5, '01-MAY-24 12:00:01'));
    expect(start).toBeNull();
    expect(remarks).toEqual(['the data sets state different starts, none is taken from them']);
  });
});

describe('what is no recording', () => {
  const refused = (text: string) => refusalOf(universalReader, bytesOf(text));

  test.each([
    [
      'times in milliseconds',
      withLine(10, '        17    0    0    0 Time                 ms                  '),
      'unsupported',
      'its times are in ms',
    ],
    [
      'no interval',
      withLine(9, '         4         8         1  0.00000E+00  0.00000E+00  0.00000E+00'),
      'damaged',
      'an interval of 0 s',
    ],
    [
      'no values',
      withLine(9, '         4         0         1  0.00000E+00  3.90625E-05  0.00000E+00'),
      'damaged',
      '0 values',
    ],
    [
      'an unknown ordinate',
      withLine(9, '         3         8         1  0.00000E+00  3.90625E-05  0.00000E+00'),
      'damaged',
      'ordinate type 3',
    ],
    [
      'letters for a count',
      withLine(9, '         4     eight         1  0.00000E+00  3.90625E-05  0.00000E+00'),
      'damaged',
      "record 7: 'eight' is no number",
    ],
    [
      'nothing but units',
      '    -1\n   164\nanything\n    -1\n',
      'unsupported',
      'no time response (data set 58, function type 1) in it, but data set 164',
    ],
    [
      'words between data sets',
      `${sample}hello\n${sample}`,
      'damaged',
      "data set 2: 'hello', where '    -1'",
    ],
  ] as const)('%s', (_, text, kind, reason) => {
    expect(refused(text)).toMatchObject({ refused: kind, reason: expect.stringContaining(reason) });
  });

  test('a count of bytes that the values, or the closing line, contradict', () => {
    expect(refusalOf(universalReader, binary(sine, { bytes: 72 }))?.reason).toContain(
      'its first line says 72 bytes, its 8 values need 64',
    );
    const file = binary(sine);
    const at = file.length - 40;
    const lost = Uint8Array.from([...file.subarray(0, at), ...file.subarray(at + 3), ...bytesOf(sample)]);
    expect(refusalOf(universalReader, lost)).toMatchObject({
      refused: 'damaged',
      reason: expect.stringContaining("no '    -1' behind its 64 bytes"),
    });
  });

  test('an absurd count of values is promised, not allocated', () => {
    const text = withLine(9, '         4 999999999         1  0.00000E+00  3.90625E-05  0.00000E+00');
    expect(refused(text)?.reason).toContain('2 lines of values, where 999999999 values need 250000000');
    const cut = text.slice(0, -7);
    expect(headerOf(cut)).toMatchObject({ complete: false, framesClaimed: 999_999_999 });
    expect(readAll(universalReader, bytesOf(cut)).channels).toEqual([sine]);
  });
});

describe('a file that is not all there', () => {
  test('cut anywhere it waits, and never gives a value that is cut', () => {
    for (const whole of [bytesOf(sample), binary(sine), bytesOf(sample + sample)]) {
      const closed = whole.length - 1;
      const first = whole.length === 2 * sample.length ? sample.length : Infinity;
      for (let length = 1; length < closed; length++) {
        const part = whole.slice(0, length);
        const header = universalReader.header(bytesSource(part));
        if (isRefusal(header)) throw new Error(`${length}: ${header.reason}`);
        // Behind a closing line a file may be at its end.
        expect(header.complete, `${length} of ${whole.length} bytes`).toBe(
          length >= first - 1 && length <= first,
        );
        const { end, channels } = readAll(universalReader, part);
        if (isRefusal(end)) expect(end.refused).toBe('damaged');
        else for (const values of channels) expect(values).toEqual(sine.slice(0, end.frames));
      }
    }
  });

  test('a tail of zeros is not there yet', () => {
    const text = bytesOf(sample);
    const header = universalReader.header(bytesSource(text.slice().fill(0, text.length - 60)));
    expect(header).toMatchObject({ complete: false });
    const bytes = binary(sine);
    expect(universalReader.header(bytesSource(bytes.slice().fill(0, bytes.length - 20)))).toMatchObject({
      complete: false,
    });
  });
});

test('a table of one column that begins with -1 is text, unless it is called otherwise', () => {
  const table = bytesOf('    -1\n    58\n     3\n     4\n     5\n     6\n');
  expect(readerFor(table, 'a.csv')).toMatchObject({ format: 'CSV' });
  expect(readerFor(bytesOf(sample), 'a.csv')).toMatchObject({ format: 'UFF 58' });
  expect(readerFor(bytesOf('    -1\n'), 'a.uff')).toMatchObject({ format: 'UFF 58' });
});
