import { mostChannels } from './array-shape.ts';
import { readFully } from './byte-source.ts';
import { type Lines, linesOf } from './csv-lines.ts';
import type { ByteSource, Refusal } from './recording.ts';
import { recordCount, type TimeResponse, timeResponse } from './universal-records.ts';

/** A time response and where its values lie. */
export interface PlacedResponse extends TimeResponse {
  /** Counted from 1, of all data sets of the file. */
  readonly dataSet: number;
  readonly offset: number;
  /** Values that are there whole, of those promised. */
  readonly held: number;
}

export interface UniversalFile {
  readonly responses: readonly PlacedResponse[];
  /** Data sets that are no time responses, by what they are. */
  readonly leftOut: ReadonlyMap<string, number>;
  /** Where the file ends before its time; null: it is whole. */
  readonly cut: string | null;
}

const bounds = { longest: 4096, buffer: 65_536 };

/**
 * Goes through a universal file from data set to data set, each between two lines '    -1', and counts the lines of
 * values without reading them. The bytes of a 58b are stepped over, never split into lines, after their number was
 * held against the number of values and the closing line.
 */
export function walkUniversal(source: ByteSource): UniversalFile | Refusal {
  const responses: PlacedResponse[] = [];
  const leftOut = new Map<string, number>();
  let lines = linesOf(source, 0x0a, 0, bounds);
  for (let dataSet = 1; ; dataSet++) {
    const set = oneSet(source, lines);
    if (set === null) return { responses, leftOut, cut: dataSet === 1 ? 'no data set yet' : null };
    if (typeof set === 'string') return { responses, leftOut, cut: `data set ${dataSet}: ${set}` };
    if ('refused' in set) return { ...set, reason: `data set ${dataSet}: ${set.reason}` };
    if (set.response === null) leftOut.set(set.what, (leftOut.get(set.what) ?? 0) + 1);
    else if (responses.length === mostChannels)
      return { refused: 'unsupported', reason: `more than ${mostChannels} time responses` };
    else responses.push({ ...set.response, dataSet });
    if (set.cut !== null) return { responses, leftOut, cut: `data set ${dataSet}: ${set.cut}` };
    if (set.behind !== null) lines = linesOf(source, 0x0a, set.behind, bounds);
  }
}

interface DataSet {
  /** Null: something else, which is left out. */
  readonly response: Omit<PlacedResponse, 'dataSet'> | null;
  readonly what: string;
  /** Where the file ends within it. */
  readonly cut: string | null;
  /** Where the file goes on; null: at the next line. */
  readonly behind: number | null;
}

/** The next data set; null: none follows; a text: the file ends ahead of its values. */
function oneSet(source: ByteSource, lines: Lines): DataSet | Refusal | string | null {
  let opening = nextLine(lines);
  while (opening === '') {
    if (!lines.ended) return 'the file ends within a line';
    opening = nextLine(lines);
  }
  if (opening === null && !lines.tooLong) return null;
  if (opening === null || isZeros(opening))
    return lines.bytes[lines.start] === 0
      ? 'only zero bytes from there on'
      : unexpected('a line without end');
  if (!isDelimiter(lines)) return lines.ended ? unexpected(opening) : 'the file ends within a line';
  const identifier = nextLine(lines);
  if (identifier === null || !lines.ended) return 'the file ends within its first line';
  const [, number, rest = ''] = /^ *(\d{1,6})(.*)$/.exec(identifier) ?? [];
  if (number === undefined)
    return isZeros(identifier) ? 'only zero bytes from there on' : unexpected(identifier);
  if (number !== '58') return toItsEnd(lines, `data set ${number}`);
  const binary = rest[0] === 'b' ? binaryOf(rest.slice(1)) : null;
  if (binary !== null && 'refused' in binary) return binary;
  const records: string[] = [];
  for (let record = 1; record <= recordCount; record++) {
    const line = nextLine(lines);
    if (line === null || !lines.ended || isZeros(line)) return `the file ends in record ${record}`;
    records.push(line);
  }
  const response = timeResponse(records, binary?.littleEndian ?? null);
  if ('refused' in response) return response;
  if (!('functionType' in response)) {
    return binary === null
      ? textValues(lines, response)
      : binaryValues(source, lines.behind, binary.bytes, response);
  }
  const what = `data set 58 of function type ${response.functionType}`;
  return binary === null ? toItsEnd(lines, what) : behindBytes(source, lines.behind, binary.bytes, what);
}

function unexpected(line: string): Refusal {
  const shown = line.replace(/[^ -~]/g, '?').slice(0, 40);
  return {
    refused: 'damaged',
    reason: `'${shown}', where '    -1' and the number of a data set are expected; the file is broken ahead of it`,
  };
}

interface Binary {
  readonly littleEndian: boolean;
  readonly bytes: number;
}

/** Behind the 'b': byte order, float format, lines of text, bytes of data (I6,I6,I12,I12). */
function binaryOf(rest: string): Binary | Refusal {
  const parts = [rest.slice(0, 6), rest.slice(6, 12), rest.slice(12, 24), rest.slice(24, 36)];
  const numbers = parts.map((part) => (/^ *\d+ *$/.test(part) ? Number(part) : Number.NaN));
  const [order = 0, format = 0, textLines = 0, bytes = 0] = numbers;
  if (numbers.some(Number.isNaN) || (order !== 1 && order !== 2) || textLines !== recordCount) {
    return {
      refused: 'damaged',
      reason: 'the first line of 58b does not say byte order, float format and sizes',
    };
  }
  if (format !== 2) {
    const name = format === 1 ? 'DEC VMS' : format === 3 ? 'IBM' : `type ${format}`;
    return { refused: 'unsupported', reason: `floats of ${name}; export it with IEEE 754 floats` };
  }
  return { littleEndian: order === 1, bytes };
}

/** Lines up to the closing one; a text where the file ends first. */
function toItsEnd(lines: Lines, what: string): DataSet {
  for (;;) {
    const line = nextLine(lines);
    const cut = line === null || isZeros(line) ? 'the file ends within it' : null;
    if (line === null || cut !== null || isDelimiter(lines))
      return { response: null, what, cut, behind: null };
  }
}

function textValues(lines: Lines, response: TimeResponse): DataSet | Refusal {
  const { storage, values } = response;
  const valuesALine = storage.form === 'text' ? storage.valuesALine : 1;
  const promised = Math.ceil(values / valuesALine);
  const offset = lines.behind;
  const placed = (held: number, cut: string | null): DataSet => ({
    response: { ...response, offset, held },
    what: '',
    cut,
    behind: null,
  });
  let count = 0;
  for (;;) {
    const more = lines.next();
    const whole = Math.min(values, count * valuesALine);
    if (!more && lines.tooLong && lines.bytes[lines.start] !== 0)
      return { refused: 'damaged', reason: `a line of more than ${bounds.longest} bytes among its values` };
    if (!more || lines.bytes[lines.start] === 0)
      return placed(whole, `the file ends at ${whole} of ${values} values`);
    if (isDelimiter(lines)) {
      if (count === promised) return placed(values, null);
      const reason = `${count} lines of values, where ${values} values need ${promised}; lines were lost or doubled`;
      return { refused: 'damaged', reason };
    }
    if (!lines.ended) return placed(whole, `the file ends at ${whole} of ${values} values`);
    if (++count > promised)
      return {
        refused: 'damaged',
        reason: `more lines of values than the ${promised} that ${values} values need`,
      };
  }
}

function binaryValues(
  source: ByteSource,
  offset: number,
  bytes: number,
  response: TimeResponse,
): DataSet | Refusal {
  const { storage, values } = response;
  const width = storage.form === 'binary' ? storage.number.bytes : 1;
  if (bytes !== values * width) {
    const reason = `its first line says ${bytes} bytes, its ${values} values need ${values * width}`;
    return { refused: 'damaged', reason };
  }
  const held = Math.max(0, Math.min(values, Math.floor((source.size - offset) / width)));
  const placed = { ...response, offset, held };
  const behind = closingBehind(source, offset + bytes);
  if (behind === 'missing')
    return { refused: 'damaged', reason: `no '    -1' behind its ${bytes} bytes; bytes were lost or added` };
  const cut = behind === 'ends' ? `the file ends at ${held} of ${values} values` : null;
  return { response: placed, what: '', cut, behind: behind === 'ends' ? null : behind };
}

function behindBytes(source: ByteSource, offset: number, bytes: number, what: string): DataSet | Refusal {
  const behind = closingBehind(source, offset + bytes);
  if (behind === 'missing') return { refused: 'damaged', reason: `no '    -1' behind its ${bytes} bytes` };
  if (behind === 'ends') return { response: null, what, cut: 'the file ends within it', behind: null };
  return { response: null, what, cut: null, behind };
}

const closings = ['    -1', '\n    -1', '\r\n    -1'];

/** Where the file goes on behind the closing line that stands at `offset`, at most a line end later. */
function closingBehind(source: ByteSource, offset: number): number | 'ends' | 'missing' {
  const closing = new Uint8Array(10);
  const count = offset >= source.size ? 0 : readFully(source, offset, closing);
  const found = String.fromCharCode(...closing.subarray(0, count));
  const whole = closings.find((one) => found.startsWith(one));
  if (whole !== undefined) return offset + whole.length;
  return closings.some((one) => one.startsWith(found)) || /^\0+$/.test(found) ? 'ends' : 'missing';
}

/** The next line's text, blanks at its end cut off; null behind the last one. */
function nextLine(lines: Lines): string | null {
  return lines.next() ? latin(lines).trimEnd() : null;
}

const longestShown = 200;

function latin({ bytes, start, end }: Lines): string {
  return String.fromCharCode(...bytes.subarray(start, Math.min(end, start + longestShown)));
}

/** '    -1': other numbers end in other columns. */
function isDelimiter({ bytes, start, end }: Lines): boolean {
  if (end - start < 6 || bytes[start + 4] !== 0x2d || bytes[start + 5] !== 0x31) return false;
  for (let at = start; at < start + 4; at++) if (bytes[at] !== 0x20) return false;
  for (let at = start + 6; at < end; at++) if (bytes[at] !== 0x20) return false;
  return true;
}

function isZeros(line: string): boolean {
  return line.startsWith('\0');
}
