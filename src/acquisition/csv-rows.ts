import { type CsvDialect, isSkipped } from './csv-dialect.ts';
import { type Lines, linesOf, longestLineBytes } from './csv-lines.ts';
import { writtenDigits } from './csv-number.ts';
import { emptyRow, type Row, readRow } from './csv-row.ts';
import type { CsvTable } from './csv-table.ts';
import { type TimeSteps, timeSteps } from './csv-time-steps.ts';
import type { ByteSource, Refusal, StatedStart } from './recording.ts';

/** The rows of a text file, read from front to back into arrays of the caller's. */
export interface CsvRows {
  /** Null without a time column. */
  readonly steps: TimeSteps | null;
  /** Absolute time of the first row, once it was read. */
  start: StatedStart | null;
  /** Seconds of one unit of the time column, once the first row was read. */
  timeUnitS: number;
  /** Why the rows ended: at the end of the file (null until then), cut short, or broken. */
  end: 'whole' | { readonly truncated: string } | Refusal | null;
  /** Fills `channels` with at most `most` rows, as many as there are; returns their count. */
  fill(channels: readonly Float64Array[], most: number): number;
}

/** Plausible instants as plain numbers of seconds since 1970: 2001-09-09 to 2099. No recording lasts that long. */
const earliestEpochS = 1e9;
const latestEpochS = 4.1e9;

export function csvRows(source: ByteSource, table: CsvTable): CsvRows {
  const { dialect, timeColumn, channelColumns } = table;
  const lines = linesOf(source, dialect.lineEnd, dialect.textOffset);
  while (lines.number < dialect.firstLine - 1 && lines.next());
  const row = emptyRow(timeColumn);
  const steps = timeColumn < 0 ? null : timeSteps();
  const takeTime = steps === null ? () => true : timeTaker(table, steps, lines, row, () => rows);

  const rows: CsvRows = {
    steps,
    start: null,
    timeUnitS: table.timeUnitS ?? 1,
    end: null,
    fill(channels, most) {
      let count = 0;
      while (count < most && rows.end === null) {
        if (!lines.next()) {
          rows.end = lines.tooLong ? tooLong(lines) : 'whole';
        } else if (!isSkipped(lines.bytes, lines.start, lines.end)) {
          readRow(lines.bytes, lines.start, lines.end, dialect, row);
          const fits =
            row.bad < 0 &&
            row.fields === dialect.columns &&
            row.instantColumn === dialect.instantColumn &&
            !isCutBehindDelimiter(lines, dialect);
          if (fits && takeTime()) {
            for (let channel = 0; channel < channels.length; channel++) {
              channels[channel][count] = row.values[channelColumns[channel]];
            }
            count++;
          } else rows.end = brokenLine(lines, row, table, fits);
        }
      }
      return count;
    },
  };
  return rows;
}

/** A last line without an end whose last field is empty was cut there, rather than left empty. */
function isCutBehindDelimiter(lines: Lines, dialect: CsvDialect): boolean {
  return !lines.ended && !dialect.trailingDelimiter && lines.bytes[lines.end - 1] === dialect.delimiter;
}

/** Gives each row's time to `steps`; false where it has none. Notes start and unit at the first row. */
function timeTaker(
  table: CsvTable,
  steps: TimeSteps,
  lines: Lines,
  row: Row,
  rows: () => CsvRows,
): () => boolean {
  const { instant } = row;
  const { decimalMark } = table.dialect;
  let begun = false;
  let firstSeconds = 0;

  if (table.timeUnitS === null) {
    return () => {
      if (!begun) {
        firstSeconds = instant.seconds;
        const ms = instant.seconds * 1000 + Math.round(instant.fraction * 1000);
        rows().start = { ms, zoned: instant.zoned, origin: 'time-column' };
        begun = true;
      }
      if (instant.fractionDigits > steps.digits.decimals) steps.digits.decimals = instant.fractionDigits;
      steps.take(instant.seconds - firstSeconds + instant.fraction);
      return true;
    };
  }
  return () => {
    const time = row.values[table.timeColumn];
    if (!Number.isFinite(time)) return false;
    if (!begun) {
      noteEpoch(time, table, rows());
      begun = true;
    }
    writtenDigits(lines.bytes, row.timeFrom, row.timeTo, decimalMark, steps.digits);
    steps.take(time);
    return true;
  };
}

/** Numbers of the size of seconds (or, with no unit said, milliseconds) since 1970 are instants, of UTC. */
function noteEpoch(time: number, table: CsvTable, rows: CsvRows): void {
  if (!table.timeUnitStated && time >= earliestEpochS * 1000 && time < latestEpochS * 1000)
    rows.timeUnitS = 1e-3;
  const seconds = time * rows.timeUnitS;
  if (seconds >= earliestEpochS && seconds < latestEpochS) {
    rows.start = { ms: Math.round(seconds * 1000), zoned: true, origin: 'time-column' };
  }
}

function tooLong(lines: Lines): Refusal | { truncated: string } {
  if (lines.bytes[lines.start] === 0) return zeros(lines);
  const reason = `line ${lines.number}: longer than ${longestLineBytes} bytes; this is not a row of samples`;
  return { refused: 'damaged', reason };
}

function zeros(lines: Lines): { truncated: string } {
  return { truncated: `only zero bytes from line ${lines.number} on: the file was not written to its end` };
}

function brokenLine(lines: Lines, row: Row, table: CsvTable, fits: boolean): Refusal | { truncated: string } {
  const { columns } = table.dialect;
  if (lines.bytes.subarray(lines.start, lines.end).includes(0)) return zeros(lines);
  if (!lines.ended) return { truncated: `the last line, ${lines.number}, is cut short: dropped` };
  const where = `line ${lines.number}`;
  const damaged = (what: string): Refusal => ({
    refused: 'damaged',
    reason: `${where}: ${what}; the file is broken there, record or export it again`,
  });
  if (row.bad >= 0) return damaged(`field ${row.bad + 1} is no number`);
  if (row.fields > columns && row.fields > 1024) return damaged('more than 1024 fields');
  if (row.fields !== columns) return damaged(`${row.fields} fields where ${columns} are expected`);
  if (fits) return damaged(`no time in field ${table.timeColumn + 1}`);
  return damaged(`a date where a number is expected, or the other way round`);
}
