import { readHead } from './byte-source.ts';
import { type CsvDialect, csvDialect } from './csv-dialect.ts';
import { distinctNames, nameAndUnit } from './csv-heading.ts';
import { mostColumns } from './csv-row.ts';
import { secondsOfUnit, type TimeHeading, timeHeadingOf } from './csv-time.ts';
import { type ByteSource, isRefusal, type Refusal } from './recording.ts';

/** A text file's columns: which is time and in what unit, which are channels and what they are called. */
export interface CsvTable {
  readonly dialect: CsvDialect;
  /** -1 without a time column. */
  readonly timeColumn: number;
  /** Null: date-times. */
  readonly timeUnitS: number | null;
  /** Whether the file says the unit of a time column of numbers. */
  readonly timeUnitStated: boolean;
  readonly channelColumns: readonly number[];
  readonly channelNames: readonly string[];
  readonly channelUnits: readonly (string | null)[];
}

/** Null where the file holds headings at most, so far. */
export function csvTable(source: ByteSource): CsvTable | Refusal | null {
  const head = readHead(source);
  const dialect = csvDialect(head, head.length === source.size);
  if (dialect === null) {
    if (head.length === source.size || head.every((byte) => byte === 0)) return null;
    return { refused: 'damaged', reason: noNumbers(`the first ${head.length} bytes`) };
  }
  if (isRefusal(dialect)) return dialect;
  const { columns, headings, instantColumn, firstLine } = dialect;
  if (columns > mostColumns) {
    const reason = `line ${firstLine}: more than ${mostColumns} columns; split the recording`;
    return { refused: 'unsupported', reason };
  }
  const time = timeColumnOf(dialect);
  if (time !== null && time.column !== instantColumn && time.unitS === null && time.unitText !== null) {
    const reason = `unit '${nameAndUnit(time.unitText).name}' of the time column is not known; have it written in s or ms`;
    return { refused: 'unsupported', reason };
  }
  const timeColumn = time?.column ?? -1;
  const channelColumns = Array.from({ length: columns }, (_, column) => column).filter(
    (c) => c !== timeColumn,
  );
  if (channelColumns.length === 0) {
    return {
      refused: 'damaged',
      reason: `line ${firstLine}: a time column and no other; have samples written`,
    };
  }
  const described = channelColumns.map((column) => nameAndUnit(headings.names?.[column] ?? ''));
  return {
    dialect,
    timeColumn,
    timeUnitS: timeColumn === instantColumn ? null : (time?.unitS ?? 1),
    timeUnitStated: time?.unitS != null,
    channelColumns,
    channelNames: distinctNames(described.map((channel) => channel.name)),
    channelUnits: channelColumns.map((column, index) => headings.units?.[column] ?? described[index].unit),
  };
}

export function noNumbers(where: string): string {
  return `no row of numbers in ${where}; columns of samples separated by comma, semicolon or tab are expected`;
}

/** Date-times are a time column without a heading; numbers are one where heading or unit row says so. */
function timeColumnOf({
  headings,
  instantColumn,
}: CsvDialect): (TimeHeading & { readonly column: number }) | null {
  if (instantColumn >= 0) return { column: instantColumn, unitS: null, unitText: null };
  const { names, units } = headings;
  const unitIn = (column: number): TimeHeading => {
    const unitText = units?.[column] ?? null;
    return { unitText, unitS: unitText === null ? null : (secondsOfUnit(unitText) ?? null) };
  };
  for (const [column, name] of (names ?? []).entries()) {
    const heading = timeHeadingOf(name);
    if (heading !== null) return { column, ...(heading.unitText === null ? unitIn(column) : heading) };
  }
  const first = unitIn(0);
  return first.unitS !== null && (units?.length ?? 0) > 1 ? { column: 0, ...first } : null;
}
