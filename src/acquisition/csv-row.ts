import { scanNumber, wordValue } from './csv-number.ts';
import { type Instant, readInstant, readPlainInstant } from './csv-time.ts';

export const mostColumns = 1024;

const space = 0x20;
const tab = 0x09;
const quote = 0x22;
const colon = 0x3a;
const longestInstant = 48;

/** How a row of numbers is written. The delimiter `space` means any run of spaces and tabs. */
export interface RowLayout {
  readonly delimiter: number;
  readonly decimalMark: number;
  /** Every row ends in a delimiter behind which no column stands. */
  readonly trailingDelimiter: boolean;
}

/** What a row held. One is kept and filled again for each line. */
export interface Row {
  readonly values: Float64Array;
  fields: number;
  /** Fields with a number, NaN and inf among them; empty ones not. */
  numbers: number;
  /** Index of the first field that is neither number nor date-time, else -1. */
  bad: number;
  /** Where a date-time stood, else -1. */
  instantColumn: number;
  readonly instant: Instant;
  /** The time column to note, and where its field lies. */
  timeColumn: number;
  timeFrom: number;
  timeTo: number;
}

export function emptyRow(timeColumn = -1): Row {
  return {
    values: new Float64Array(mostColumns + 1),
    fields: 0,
    numbers: 0,
    bad: -1,
    instantColumn: -1,
    instant: { seconds: 0, fraction: 0, fractionDigits: 0, zoned: false },
    timeColumn,
    timeFrom: 0,
    timeTo: 0,
  };
}

/** Reads `bytes[start..end)` into `row`; an empty field is NaN. Stops at the first field that it cannot read. */
export function readRow(bytes: Uint8Array, start: number, end: number, layout: RowLayout, row: Row): void {
  const { delimiter, decimalMark } = layout;
  const blanks = delimiter === space;
  let at = blanks ? pastBlanks(bytes, start, end) : start;
  let to = end;
  if (layout.trailingDelimiter && to > at && bytes[to - 1] === delimiter) to--;
  row.fields = 0;
  row.numbers = 0;
  row.bad = -1;
  row.instantColumn = -1;
  for (;;) {
    // One column more than can be is enough to say that there are too many.
    if (row.fields > mostColumns) return;
    let after = scanNumber(bytes, at, to, decimalMark, row.values, row.fields);
    while (after >= 0 && after < to && bytes[after] === space && !blanks) after++;
    if (after >= 0 && (after >= to || bytes[after] === delimiter || (blanks && bytes[after] === tab))) {
      row.numbers++;
    } else {
      after = readOtherField(bytes, at, to, layout, row);
      if (after < 0) {
        row.bad = row.fields;
        return;
      }
    }
    if (row.fields === row.timeColumn) {
      row.timeFrom = at;
      row.timeTo = after;
    }
    row.fields++;
    if (blanks) after = pastBlanks(bytes, after, to);
    if (after >= to) return;
    at = blanks ? after : after + 1;
    // A delimiter that ends the line opens one more field, an empty one; the next turn reads it.
  }
}

/** A field that is no bare number: quoted, empty, NaN or inf, or a date-time. Returns where it ends, -1 if none. */
function readOtherField(bytes: Uint8Array, from: number, to: number, layout: RowLayout, row: Row): number {
  let first = from;
  while (first < to && bytes[first] === space) first++;
  if (first < to && bytes[first] === quote) {
    const closing = bytes.subarray(first + 1, to).indexOf(quote) + first + 1;
    if (closing <= first) return -1;
    let after = closing + 1;
    while (after < to && bytes[after] === space && layout.delimiter !== space) after++;
    if (after < to && !endsField(bytes[after], layout)) return -1;
    return readContent(bytes, first + 1, closing, layout, row) ? after : -1;
  }
  let end = first;
  while (end < to && !endsField(bytes[end], layout)) end++;
  return readContent(bytes, first, end, layout, row) ? end : -1;
}

function readContent(bytes: Uint8Array, from: number, to: number, layout: RowLayout, row: Row): boolean {
  let end = to;
  while (end > from && bytes[end - 1] === space) end--;
  if (row.instantColumn < 0 && readPlainInstant(bytes, from, end, row.instant)) {
    return takeInstant(row);
  }
  if (scanNumber(bytes, from, end, layout.decimalMark, row.values, row.fields) === end && end > from) {
    row.numbers++;
    return true;
  }
  const value = wordValue(bytes, from, end);
  if (value !== undefined) {
    row.values[row.fields] = value;
    if (end > from) row.numbers++;
    return true;
  }
  if (row.instantColumn >= 0 || end - from > longestInstant) return false;
  if (!bytes.subarray(from, end).includes(colon)) return false;
  if (!readInstant(String.fromCharCode(...bytes.subarray(from, end)), row.instant)) return false;
  return takeInstant(row);
}

function takeInstant(row: Row): boolean {
  row.instantColumn = row.fields;
  row.values[row.fields] = Number.NaN;
  return true;
}

function endsField(byte: number, layout: RowLayout): boolean {
  return byte === layout.delimiter || (layout.delimiter === space && byte === tab);
}

function pastBlanks(bytes: Uint8Array, from: number, to: number): number {
  let at = from;
  while (at < to && (bytes[at] === space || bytes[at] === tab)) at++;
  return at;
}
