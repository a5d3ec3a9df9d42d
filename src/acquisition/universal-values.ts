import { readFully } from './byte-source.ts';
import { linesOf } from './csv-lines.ts';
import { scanNumber, wordValue } from './csv-number.ts';
import type { ByteSource } from './recording.ts';
import { pickSamples, toMachineOrder } from './sample-numbers.ts';
import type { PlacedResponse } from './universal-walk.ts';

/** The values of one data set from front to back; behind each other data sets are read side by side. */
export interface UniversalValues {
  /** `count` values into `out`; in words where one of them is none. */
  fill(out: Float64Array, count: number): string | null;
}

/** Blocks are multiples of this, so that each begins with a line of text. */
export const valuesTogether = 12;

const longestLine = 4096;
const decimalPoint = 0x2e;
const blank = 0x20;

/** `bufferBytes` bounds what each data set holds of the file; `scratch` is shared by all of them. */
export function universalValues(
  source: ByteSource,
  response: PlacedResponse,
  bufferBytes: number,
  scratch: Uint8Array,
): UniversalValues {
  const { storage, offset, dataSet } = response;
  if (storage.form === 'text') return textValues(source, response, storage, bufferBytes);
  let given = 0;
  return {
    fill(out, count) {
      const { number } = storage;
      const bytes = scratch.subarray(0, count * number.bytes);
      if (readFully(source, offset + given * number.bytes, bytes) < bytes.length)
        return `data set ${dataSet}: the file shrank while it was read`;
      toMachineOrder(bytes, number);
      pickSamples(bytes, number, { first: 0, step: 1, count }, out);
      given += count;
      return null;
    },
  };
}

/**
 * Values in columns of fixed width, which may touch each other. Exponents are written with E, with D, or with their
 * sign alone; a column of asterisks is a number that did not fit, and no number.
 */
function textValues(
  source: ByteSource,
  { offset, dataSet, values }: PlacedResponse,
  { width, valuesALine }: { readonly width: number; readonly valuesALine: number },
  bufferBytes: number,
): UniversalValues {
  const buffer = Math.max(2 * longestLine, bufferBytes);
  const lines = linesOf(source, 0x0a, offset, { longest: longestLine, buffer });
  let given = 0;
  return {
    fill(out, count) {
      for (let n = 0; n < count; ) {
        if (!lines.next()) return `data set ${dataSet}: the file shrank while it was read`;
        const inLine = Math.min(valuesALine, count - n);
        for (let column = 0; column < inLine; column++, n++) {
          const from = lines.start + column * width;
          const to = Math.min(from + width, lines.end);
          if (!readValue(lines.bytes, from, to, out, n))
            return `data set ${dataSet}: value ${given + n + 1} of ${values} is no number; the file is broken there`;
        }
        for (let at = lines.start + inLine * width; at < lines.end; at++)
          if (lines.bytes[at] !== blank)
            return `data set ${dataSet}: more than ${inLine} values in a line, behind value ${given + n}`;
      }
      given += count;
      return null;
    },
  };
}

function readValue(bytes: Uint8Array, from: number, to: number, out: Float64Array, index: number): boolean {
  if (from >= to) return false;
  for (let at = from; at < to; at++) if ((bytes[at] | 0x20) === 0x64) bytes[at] = 0x45;
  let end = scanNumber(bytes, from, to, decimalPoint, out, index);
  while (end >= 0 && end < to && bytes[end] === blank) end++;
  return end === to || readOdd(String.fromCharCode(...bytes.subarray(from, to)), bytes, from, to, out, index);
}

function readOdd(
  text: string,
  bytes: Uint8Array,
  from: number,
  to: number,
  out: Float64Array,
  index: number,
): boolean {
  const trimmed = text.trim();
  if (trimmed === '') return false;
  const signOnly = /^([+-]?\d*\.\d*)([+-]\d{2,3})$/.exec(trimmed);
  const value = /^\*+$/.test(trimmed)
    ? Number.NaN
    : signOnly === null
      ? wordValue(bytes, from, to)
      : Number(`${signOnly[1]}E${signOnly[2]}`);
  if (value === undefined) return false;
  out[index] = value;
  return true;
}
