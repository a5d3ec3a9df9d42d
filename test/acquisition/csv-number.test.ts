import fc from 'fast-check';
import { expect, test } from 'vitest';
import { scanNumber, wordValue, writtenDigits } from '../../src/acquisition/csv-number.ts';

const bytesOf = (text: string): Uint8Array => new TextEncoder().encode(text);

/** The number at the beginning of a text and what stands behind it. */
function scan(text: string, decimalMark = '.'): { value: number; rest: string } | null {
  const out = new Float64Array(1);
  const bytes = bytesOf(text);
  const end = scanNumber(bytes, 0, bytes.length, decimalMark.charCodeAt(0), out, 0);
  return end < 0 ? null : { value: out[0], rest: text.slice(end) };
}

const readsAsWritten = (text: string): void => {
  expect(scan(text)).toEqual({ value: Number(text), rest: '' });
  expect(scan(text.replace('.', ','), ',')).toEqual({ value: Number(text), rest: '' });
};

test('plain numbers with sign, point and exponent', () => {
  const texts =
    '0 -0 +5 12 -7.25 .5 5. 1e3 1E-3 1e+22 -2.5e-22 007 0.1 1e300 -1e-300 1e400 1e-400 4.9e-324 0e9999';
  for (const text of texts.split(' ')) readsAsWritten(text);
  expect(scan('  -1.5 ')).toEqual({ value: -1.5, rest: ' ' });
});

test('what is no number', () => {
  for (const text of ['', ' ', '-', '+', '.', '-.', 'e5', '1e', '1e+', 'abc', '--1', '\t1']) {
    expect(scan(text)).toBeNull();
  }
});

test('a number ends where its letters end; the caller judges what follows', () => {
  expect(scan('1,5')).toEqual({ value: 1, rest: ',5' });
  expect(scan('1.5', ',')).toEqual({ value: 1, rest: '.5' });
  expect(scan('0x10')).toEqual({ value: 0, rest: 'x10' });
  expect(scan('12abc')).toEqual({ value: 12, rest: 'abc' });
});

test('every double is read back from its shortest text and from 1 to 25 digits, to the last bit', () => {
  const anyDouble = fc.oneof(
    fc.double({ noNaN: true, noDefaultInfinity: true }),
    fc.double({ noNaN: true, noDefaultInfinity: true, min: -1000, max: 1000 }),
    fc.integer().map((value) => value / 25_600),
  );
  fc.assert(
    fc.property(anyDouble, fc.integer({ min: 0, max: 24 }), (value, digits) => {
      readsAsWritten(String(value));
      readsAsWritten(value.toExponential(digits));
      if (Math.abs(value) < 1e15) readsAsWritten(value.toFixed(digits));
    }),
    { seed: 20261201, numRuns: 20_000 },
  );
});

test('texts that lie exactly, or almost, in the middle of two doubles go to the right one', () => {
  // 1 + 2^-53 lies in the middle of 1 and its successor: to the even one; a little more goes up.
  readsAsWritten('1.00000000000000011102230246251565404236316680908203125');
  readsAsWritten('1.000000000000000111');
  readsAsWritten('1.000000000000000112');
  readsAsWritten('9007199254740993');
  readsAsWritten('9007199254740993.001');
  readsAsWritten('0.9007199254740993');
  // As near to a middle as 19 digits can come: solutions of m 2^s - M 5^k = +-1 or 3 with M odd, of 54 bits.
  readsAsWritten('0.0019501378702487317');
  readsAsWritten('0.0011435816121731433');
  readsAsWritten('0.001593200273735477881');
  readsAsWritten('0.0235956995763234572');
  readsAsWritten('0.0002453642445960202');
  readsAsWritten('0.00048171469000870282');
  fc.assert(
    fc.property(fc.integer({ min: 2 ** 40, max: 2 ** 52 }), fc.integer({ min: 0, max: 12 }), (odd, shift) => {
      // Two neighbouring doubles above 2^53 and the whole number between them, moved behind the point.
      const middle = ((BigInt(odd) << 12n) | 1n) + (BigInt(odd) & 1n);
      const digits = String(middle)
        .slice(0, 19)
        .padStart(shift + 1, '0');
      readsAsWritten(`${digits.slice(0, digits.length - shift)}.${digits.slice(digits.length - shift)}`);
    }),
    { seed: 20261201, numRuns: 5000 },
  );
});

test('nothing, NaN and inf in any case stand for samples; other words do not', () => {
  const word = (text: string): number | undefined => wordValue(bytesOf(text), 0, text.length);
  for (const text of ['', '  ', 'NaN', 'nan', ' NAN ', '-nan', '+NaN']) expect(word(text)).toBeNaN();
  for (const text of ['inf', 'Inf', '+inf', 'Infinity']) expect(word(text)).toBe(Number.POSITIVE_INFINITY);
  for (const text of ['-inf', '-INFINITY']) expect(word(text)).toBe(Number.NEGATIVE_INFINITY);
  for (const text of ['n/a', 'ERR', 'infinite', 'toString', '-', '+', 'constructor', 'nanx']) {
    expect(word(text)).toBeUndefined();
  }
});

test('digits behind the mark and significant digits, exponents counted in', () => {
  const digits = (text: string): number[] => {
    const found = { decimals: 0, significant: 0 };
    writtenDigits(bytesOf(text), 0, text.length, 0x2e, found);
    return [found.decimals, found.significant];
  };
  expect(digits('0.000390')).toEqual([6, 3]);
  expect(digits('12')).toEqual([0, 2]);
  expect(digits('3.90625e-05')).toEqual([10, 6]);
  expect(digits('1.5E+3')).toEqual([0, 2]);
});
