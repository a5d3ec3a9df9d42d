/** Exact powers of ten of a double. */
const powersOfTen = Float64Array.from({ length: 23 }, (_, exponent) => Number(`1e${exponent}`));
/** Up to this many digits a mantissa is exact in a double. */
const exactDigits = 15;

const space = 0x20;
const tab = 0x09;

/**
 * Reads one plain number (sign, digits, decimal mark, exponent) from `bytes[from]` on, not beyond `to`, with spaces
 * before it, and writes it to `out[index]`. Returns the position behind the number, or -1 where none stands.
 *
 * Up to 15 digits with a power of ten up to 22 are exact by one multiplication or division (Clinger, How to read
 * floating point numbers accurately, 1990); up to 19 digits go through a quotient of twice the precision; all others
 * are left to the language's own conversion. So every value is the double nearest to what is written.
 */
export function scanNumber(
  bytes: Uint8Array,
  from: number,
  to: number,
  decimalMark: number,
  out: Float64Array,
  index: number,
): number {
  let at = from;
  while (at < to && bytes[at] === space) at++;
  const first = at;
  const negative = bytes[at] === 0x2d;
  if (at < to && (negative || bytes[at] === 0x2b)) at++;

  let mantissa = 0;
  let digits = 0;
  let any = false;
  let exponent = 0;
  for (; at < to; at++) {
    const digit = bytes[at] - 0x30;
    if (digit < 0 || digit > 9) break;
    any = true;
    mantissa = mantissa * 10 + digit;
    if (mantissa !== 0) digits++;
  }
  if (at < to && bytes[at] === decimalMark) {
    at++;
    for (; at < to; at++) {
      const digit = bytes[at] - 0x30;
      if (digit < 0 || digit > 9) break;
      any = true;
      mantissa = mantissa * 10 + digit;
      exponent--;
      if (mantissa !== 0) digits++;
    }
  }
  if (!any) return -1;
  if (at < to && (bytes[at] | 0x20) === 0x65) {
    const end = exponentEnd(bytes, at + 1, to);
    if (end < 0) return -1;
    exponent += exponentValue(bytes, at + 1, end);
    at = end;
  }
  if (digits > exactDigits || exponent < -22 || exponent > 22) {
    out[index] = mantissa === 0 ? (negative ? -0 : 0) : longNumber(bytes, first, at, digits, exponent);
    return at;
  }
  const value = exponent < 0 ? mantissa / powersOfTen[-exponent] : mantissa * powersOfTen[exponent];
  out[index] = negative ? -value : value;
  return at;
}

function exponentEnd(bytes: Uint8Array, from: number, to: number): number {
  let at = from;
  if (at < to && (bytes[at] === 0x2b || bytes[at] === 0x2d)) at++;
  const firstDigit = at;
  while (at < to && bytes[at] >= 0x30 && bytes[at] <= 0x39) at++;
  return at === firstDigit ? -1 : at;
}

function exponentValue(bytes: Uint8Array, from: number, end: number): number {
  const negative = bytes[from] === 0x2d;
  let value = 0;
  for (let at = negative || bytes[from] === 0x2b ? from + 1 : from; at < end; at++) {
    value = Math.min(value * 10 + bytes[at] - 0x30, 100_000);
  }
  return negative ? -value : value;
}

const mostQuotientDigits = 19;
const lowDigits = 9;
/** Bound of the quotient's relative error, a few times 2^-104, with room to spare. */
const quotientError = 2 ** -98;
/** Splits a double into halves whose products are exact (Dekker, A floating-point technique, 1971). */
const splitter = 2 ** 27 + 1;

/** `from` to `to`: sign, digits, mark and exponent; `digits` significant ones times ten to `exponent`. */
function longNumber(bytes: Uint8Array, from: number, to: number, digits: number, exponent: number): number {
  if (digits <= lowDigits || digits > mostQuotientDigits || exponent < -22 || exponent > 0) {
    return convertAsText(bytes, from, to);
  }
  // The digits as high x 10^9 + low, both exact.
  let high = 0;
  let low = 0;
  let left = digits;
  for (let at = from; left > 0; at++) {
    const digit = bytes[at] - 0x30;
    if (digit < 0 || digit > 9 || (digit === 0 && left === digits)) continue;
    if (left > lowDigits) high = high * 10 + digit;
    else low = low * 10 + digit;
    left--;
  }
  const scaled = high * 1e9;
  const whole = scaled + low;
  const wholeRest = productRest(high, 1e9, scaled) + (low - (whole - scaled));
  const divisor = powersOfTen[-exponent];
  const quotient = whole / divisor;
  const back = quotient * divisor;
  const rest = whole - back - productRest(quotient, divisor, back) + wholeRest;
  const correction = rest / divisor;
  const margin = quotient * quotientError;
  const value = quotient + (correction - margin);
  // Too near the middle of two doubles to tell which is nearer.
  if (value !== quotient + (correction + margin)) return convertAsText(bytes, from, to);
  return bytes[from] === 0x2d ? -value : value;
}

/** What rounding took from `product` = a x b, exactly. */
function productRest(a: number, b: number, product: number): number {
  const bigA = splitter * a;
  const highA = bigA - (bigA - a);
  const lowA = a - highA;
  const bigB = splitter * b;
  const highB = bigB - (bigB - b);
  const lowB = b - highB;
  return lowA * lowB - (product - highA * highB - lowA * highB - highA * lowB);
}

function convertAsText(bytes: Uint8Array, from: number, to: number): number {
  let text = '';
  for (let at = from; at < to; at++) text += bytes[at] === 0x2c ? '.' : String.fromCharCode(bytes[at]);
  return Number(text);
}

const words: Readonly<Record<string, number>> = {
  '': Number.NaN,
  nan: Number.NaN,
  inf: Number.POSITIVE_INFINITY,
  infinity: Number.POSITIVE_INFINITY,
};
const longestWord = 9;

/**
 * What stands in a field instead of a number: nothing, 'NaN', 'inf', 'infinity' with a sign, in any case. Undefined
 * for any other text. Quality deals with such samples; here they are passed on.
 */
export function wordValue(bytes: Uint8Array, from: number, to: number): number | undefined {
  let text = '';
  for (let at = from; at < to; at++) {
    if (bytes[at] === space || bytes[at] === tab) continue;
    if (text.length === longestWord) return undefined;
    text += String.fromCharCode(bytes[at]);
  }
  const word = text.toLowerCase();
  if (word.startsWith('-') && word.length > 1) {
    const value = words[word.slice(1)];
    return value === undefined ? undefined : -value;
  }
  return words[word.startsWith('+') && word.length > 1 ? word.slice(1) : word];
}

/**
 * How finely a plain number is written: digits behind its decimal mark and significant digits, for judging what
 * rounding alone can do to the steps of a time column. Digits of an exponent do not count.
 */
export function writtenDigits(
  bytes: Uint8Array,
  from: number,
  to: number,
  decimalMark: number,
  digits: Digits,
): void {
  let behindMark = 0;
  let significant = 0;
  let marked = false;
  let at = from;
  for (; at < to && (bytes[at] | 0x20) !== 0x65; at++) {
    const byte = bytes[at];
    if (byte === decimalMark) marked = true;
    else if (byte >= 0x30 && byte <= 0x39) {
      if (marked) behindMark++;
      if (byte !== 0x30 || significant > 0) significant++;
    }
  }
  const decimals = at < to ? behindMark - exponentValue(bytes, at + 1, to) : behindMark;
  if (decimals > digits.decimals) digits.decimals = decimals;
  if (significant > digits.significant) digits.significant = significant;
}

export interface Digits {
  decimals: number;
  significant: number;
}
