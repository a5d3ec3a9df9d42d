import { type Headings, headingsOf, splitHeading } from './csv-heading.ts';
import { emptyRow, type Row, type RowLayout, readRow } from './csv-row.ts';
import type { Refusal } from './recording.ts';

/** How a text file is written, judged from its first 64 kB. */
export interface CsvDialect extends RowLayout {
  /** Where the text begins, behind a byte-order mark. */
  readonly textOffset: number;
  readonly lineEnd: number;
  /** Columns of a row, the time column among them. */
  readonly columns: number;
  /** Line of the first row of numbers, counted from 1. */
  readonly firstLine: number;
  /** Column of date-times, else -1. */
  readonly instantColumn: number;
  readonly headings: Headings;
}

const lineFeed = 0x0a;
const carriageReturn = 0x0d;
const comma = 0x2c;
const point = 0x2e;
const space = 0x20;
const quote = 0x22;
const sampleLines = 16;
/** So many rows in a line begin the numbers; a single one may be a line of the preamble. */
const rowsToBegin = 3;

/** In order of preference where two read the same columns. A comma as decimal mark counts last. */
const candidates: readonly RowLayout[] = [0x09, 0x3b, comma, space].flatMap((delimiter) =>
  [point, comma].map((decimalMark) => ({ delimiter, decimalMark, trailingDelimiter: false })),
);

interface Line {
  readonly start: number;
  readonly end: number;
  readonly number: number;
}

/**
 * Finds delimiter, decimal mark, headings and the first row of numbers. `whole`: `head` is the whole file.
 * Null where no row of numbers is there yet.
 */
export function csvDialect(head: Uint8Array, whole: boolean): CsvDialect | Refusal | null {
  if ((head[0] === 0xff && head[1] === 0xfe) || (head[0] === 0xfe && head[1] === 0xff)) {
    return { refused: 'unsupported', reason: 'byte 0: this text is UTF-16; have it written as UTF-8' };
  }
  const textOffset = head[0] === 0xef && head[1] === 0xbb && head[2] === 0xbf ? 3 : 0;
  const zero = head.indexOf(0);
  const text = zero < 0 ? head : head.subarray(0, zero);
  const lineEnd = text.includes(lineFeed) || !text.includes(carriageReturn) ? lineFeed : carriageReturn;
  const lines = linesIn(text, textOffset, lineEnd, whole && zero < 0);
  const filled = lines.filter((line) => !isSkipped(text, line.start, line.end));
  const row = emptyRow();
  const best = bestLayout(text, filled.slice(-sampleLines), row);
  if (best === null) return null;
  const rowAt = (line: Line): boolean => isRow(text, line, best.layout, row) && row.fields === best.columns;
  const first = filled.findIndex((_, index) => filled.slice(index, index + rowsToBegin).every(rowAt));
  if (first < 0) return null;
  const firstLine = filled[first];
  const above = lines.filter((line) => line.number < firstLine.number && line.end > line.start).slice(-2);
  return settled(text, best, firstLine, above.reverse(), {
    textOffset,
    lineEnd,
    sample: filled.slice(-sampleLines),
  });
}

interface Best {
  readonly layout: RowLayout;
  readonly columns: number;
}

interface Surroundings {
  readonly textOffset: number;
  readonly lineEnd: number;
  readonly sample: readonly Line[];
}

/** Headings, a delimiter at the end of each row, and the doubtful case of commas for both purposes. */
function settled(
  text: Uint8Array,
  best: Best,
  first: Line,
  above: readonly Line[],
  { textOffset, lineEnd, sample }: Surroundings,
): CsvDialect | Refusal {
  let { layout, columns } = best;
  const delimiter = String.fromCharCode(layout.delimiter);
  let fields = above.map((line) => splitHeading(decoded(text.subarray(line.start, line.end)), delimiter));
  const rows = sample.filter((line) => line.number >= first.number);

  const commas = layout.delimiter === comma ? commasAreDecimal(text, columns, fields[0], rows) : 'no';
  if (commas === 'mixed') {
    const reason =
      `line ${first.number}: ${columns} fields under ${columns / 2} headings, the comma stands for both decimal mark ` +
      'and separator; have it written with semicolons or decimal points';
    return { refused: 'damaged', reason };
  }
  if (commas === 'yes') {
    layout = { delimiter: 0x3b, decimalMark: comma, trailingDelimiter: false };
    columns = 1;
  }
  const trailing =
    columns > 1 &&
    layout.delimiter !== space &&
    rows.every((line) => text[line.end - 1] === layout.delimiter) &&
    (fields[0]?.length !== columns || fields[0][columns - 1] === '');
  if (trailing) {
    layout = { ...layout, trailingDelimiter: true };
    columns--;
    fields = fields.map((names) => (names.length === columns + 1 ? names.slice(0, -1) : names));
  }
  const row = emptyRow();
  readRow(text, first.start, first.end, layout, row);
  const headings = headingsOf(fields, columns);
  const instantColumn = row.instantColumn;
  return { ...layout, textOffset, lineEnd, columns, firstLine: first.number, instantColumn, headings };
}

/**
 * '0,05' may be one number or two. Taken as one where the heading has one field, or where the second part has a
 * leading zero as no whole number has; two headings over four fields are refused rather than guessed.
 */
function commasAreDecimal(
  text: Uint8Array,
  columns: number,
  heading: readonly string[] | undefined,
  rows: readonly Line[],
): 'yes' | 'no' | 'mixed' {
  const texts = rows.map((line) => decoded(text.subarray(line.start, line.end)));
  if (columns % 2 !== 0 || texts.some((line) => line.includes('.') || line.includes('"'))) return 'no';
  if (columns === 2 && texts.some((line) => /,0\d/.test(line))) return 'yes';
  if (heading === undefined || heading.length * 2 !== columns) return 'no';
  return columns === 2 ? 'yes' : 'mixed';
}

/** The layout that reads most of the sampled lines as rows of one width; the wider one where two do. */
function bestLayout(text: Uint8Array, sample: readonly Line[], row: Row): Best | null {
  let best: Best | null = null;
  let mostRows = 0;
  for (const layout of candidates) {
    const widths = new Map<number, number>();
    for (const line of sample) {
      if (!isRow(text, line, layout, row)) continue;
      // '1,5' alone is left to the comma as a delimiter; whether it is one is asked afterwards.
      const quoted = text[line.start] === quote;
      if (row.fields === 1 && layout.decimalMark === comma && !quoted) continue;
      widths.set(row.fields, (widths.get(row.fields) ?? 0) + 1);
    }
    for (const [columns, rows] of widths) {
      if (rows > mostRows || (rows === mostRows && best !== null && columns > best.columns)) {
        best = { layout, columns };
        mostRows = rows;
      }
    }
  }
  return best;
}

function isRow(text: Uint8Array, line: Line, layout: RowLayout, row: Row): boolean {
  readRow(text, line.start, line.end, layout, row);
  return row.bad < 0 && row.numbers > 0;
}

/** Lines that hold no row in any text: blank ones and remarks. */
export function isSkipped(bytes: Uint8Array, start: number, end: number): boolean {
  let at = start;
  while (at < end && (bytes[at] === space || bytes[at] === 0x09)) at++;
  if (at === end) return true;
  const byte = bytes[at];
  return (
    byte === 0x23 ||
    byte === 0x25 ||
    (byte === 0x2f && bytes[at + 1] === 0x2f) ||
    (byte === 0x1a && at + 1 === end)
  );
}

function linesIn(text: Uint8Array, from: number, lineEnd: number, whole: boolean): Line[] {
  const lines: Line[] = [];
  let start = from;
  while (start < text.length) {
    const found = text.indexOf(lineEnd, start);
    if (found < 0 && !whole) break;
    const stop = found < 0 ? text.length : found;
    const end = lineEnd === lineFeed && stop > start && text[stop - 1] === carriageReturn ? stop - 1 : stop;
    lines.push({ start, end, number: lines.length + 1 });
    start = stop + 1;
  }
  return lines;
}

/** UTF-8, or Windows-1252 where it is not that: older loggers write 'm/s²' and 'µm' so. */
function decoded(bytes: Uint8Array): string {
  try {
    return new TextDecoder('utf-8', { fatal: true }).decode(bytes);
  } catch {
    return new TextDecoder('windows-1252').decode(bytes);
  }
}
