import { namePattern, realDateMs, startInName } from '../../acquisition/start-in-name.ts';
import { columnOf, firstPart, kindOf, type NamePart, type NameTable } from './name-parts.ts';

/** Columns that give the date and time of a recording, the pattern for the site file, and what it reads. */
export interface NameDate {
  readonly columns: ReadonlySet<number>;
  /** First and last of them. */
  readonly first: number;
  readonly last: number;
  readonly pattern: string;
  /** Reading of each file, as if it were UTC. */
  readonly readings: readonly number[];
  /** The name ends the time with a Z. */
  readonly saysUtc: boolean;
  /** False where the files' times of change run in another order. */
  readonly agrees: boolean;
}

type Field = 'year' | 'month' | 'day' | 'hour' | 'minute' | 'second';

/** Fields within one run of digits, by its length. */
const dateOrders: readonly (readonly Field[])[] = [
  ['year', 'month', 'day'],
  ['day', 'month', 'year'],
  ['month', 'day', 'year'],
];
const widthOf: Readonly<Record<Field, number>> = { year: 4, month: 2, day: 2, hour: 2, minute: 2, second: 2 };
/** Columns between a date and its time, such as those of `2026-03-02/blower-1_101500.wav`. */
const mostBetween = 12;

/**
 * The date in the names of a table, or null: digits that form real dates in every file and read back as such. Of several,
 * one that agrees with the times of change and differs from recording to recording.
 */
export function nameDate(table: NameTable): NameDate | null {
  let best: NameDate | null = null;
  for (let column = 0; column < table.ending; column++) {
    for (const order of dateOrders) {
      const date = dateAt(table, column, order);
      if (date !== null && (best === null || isBetter(date, best))) best = date;
    }
  }
  return best;
}

function isBetter(one: NameDate, other: NameDate): boolean {
  if (one.agrees !== other.agrees) return one.agrees;
  return new Set(one.readings).size > new Set(other.readings).size;
}

/** Columns with the fields that each of them holds. */
interface Stretch {
  readonly fields: ReadonlyMap<number, readonly Field[]>;
  readonly end: number;
}

function dateAt(table: NameTable, column: number, order: readonly Field[]): NameDate | null {
  const day = stretchOf(table, column, order);
  const whole = dayAndTime(table, column, order);
  const time = whole ?? (day === null ? null : timeBehind(table, day.end));
  if (time === null) return null;
  const fields = whole === null ? new Map([...(day?.fields ?? []), ...time.fields]) : whole.fields;
  return readDate(table, { fields, end: time.end });
}

/** `20260302101500` in one run of digits. */
function dayAndTime(table: NameTable, column: number, order: readonly Field[]): Stretch | null {
  const time: readonly Field[] = ['hour', 'minute', 'second'];
  return oneRun(table, column, [...order, ...time]) ?? oneRun(table, column, [...order, ...time.slice(0, 2)]);
}

function oneRun(table: NameTable, column: number, fields: readonly Field[]): Stretch | null {
  const width = fields.reduce((sum, field) => sum + widthOf[field], 0);
  return hasWidth(table, column, width) ? { fields: new Map([[column, fields]]), end: column + 1 } : null;
}

/** The fields in one run of digits, or each in its own with one mark (or letter, as in 10h15) between. */
function stretchOf(table: NameTable, column: number, fields: readonly Field[]): Stretch | null {
  const run = oneRun(table, column, fields);
  if (run !== null) return run;
  const columns = fields.map((_, n) => column + 2 * n);
  const apart =
    columns.every((at, n) => hasWidth(table, at, widthOf[fields[n] as Field])) &&
    columns.slice(1).every((at) => isFixed(table, at - 1) && kindOf(table, at - 1) !== 'digits');
  if (!apart) return null;
  return {
    fields: new Map(columns.map((at, n) => [at, [fields[n] as Field]])),
    end: column + 2 * fields.length - 1,
  };
}

function timeBehind(table: NameTable, from: number): Stretch | null {
  for (let column = from; column < Math.min(table.ending, from + mostBetween); column++) {
    if (kindOf(table, column) !== 'digits') continue;
    const time =
      stretchOf(table, column, ['hour', 'minute', 'second']) ?? stretchOf(table, column, ['hour', 'minute']);
    if (time !== null) return time;
  }
  return null;
}

function readDate(table: NameTable, { fields, end }: Stretch): NameDate | null {
  const readings: number[] = [];
  for (const row of table.rows) {
    const ms = readingOf(row, fields);
    if (ms === null) return null;
    readings.push(ms);
  }
  const first = Math.min(...fields.keys());
  const saysUtc = end < table.ending && columnOf(table, end).every((text) => text === 'Z');
  const pattern = patternOf(table, fields, first, saysUtc ? end + 1 : end);
  // What the service will read must be what was meant here; a pattern may also fit an earlier place in the name.
  const compiled = namePattern(pattern);
  const readsBack = table.files.every(({ path }, n) => startInName(compiled, path)?.ms === readings[n]);
  if (!readsBack) return null;
  const last = fractionEnd(table, saysUtc ? end + 1 : end) - 1;
  const columns = new Set([...fields.keys()]);
  for (let column = first; column <= last; column++) {
    if (isFixed(table, column) && !spans(table, fields, column)) columns.add(column);
  }
  for (let column = end; column <= last; column++) columns.add(column);
  return { columns, first, last, pattern, readings, saysUtc, agrees: agrees(table, columns, readings) };
}

/** A column between date and time that lies in a wider gap belongs to the name, not to the date. */
function spans(table: NameTable, fields: ReadonlyMap<number, unknown>, column: number): boolean {
  const before = Math.max(...[...fields.keys()].filter((at) => at < column));
  const behind = Math.min(...[...fields.keys()].filter((at) => at > column), table.columns);
  return behind < table.columns && behind - before > 3;
}

function readingOf(row: readonly NamePart[], fields: ReadonlyMap<number, readonly Field[]>): number | null {
  const value: Record<Field, number> = { year: 0, month: 0, day: 0, hour: 0, minute: 0, second: 0 };
  for (const [column, held] of fields) {
    let at = 0;
    for (const field of held) {
      value[field] = Number((row[column] as NamePart).text.slice(at, at + widthOf[field]));
      at += widthOf[field];
    }
  }
  return realDateMs(value.year, value.month, value.day, value.hour, value.minute, value.second);
}

/** Fixed, and in a narrow gap or right ahead of a field. */
function isKept(table: NameTable, fields: ReadonlyMap<number, unknown>, column: number): boolean {
  if (!isFixed(table, column)) return false;
  return !spans(table, fields, column) || (kindOf(table, column) === 'mark' && fields.has(column + 1));
}

/** Letters between the fields as they stand; what varies there, and all of a wider gap but its folders, is `<any>`. */
function patternOf(
  table: NameTable,
  fields: ReadonlyMap<number, readonly Field[]>,
  first: number,
  end: number,
): string {
  let pattern = '';
  for (let column = first; column < end; column++) {
    const held = fields.get(column);
    const text = firstPart(table, column).text;
    if (held !== undefined) pattern += held.map((field) => `<${field}>`).join('');
    else if (text === '/') pattern += '/';
    else if (isKept(table, fields, column) && !/[<>]/.test(text)) pattern += text;
    else if (!pattern.endsWith('<any>')) pattern += '<any>';
  }
  // Without a / only the last name of the path is looked at.
  const folders = table.rows[0]?.slice(end).some(({ text }) => text === '/') === true;
  if (!folders) return pattern;
  const text = firstPart(table, end).text;
  return text === '/' ? `${pattern}/` : `${pattern}<any>/`;
}

/** Fractions of a second behind the time: `_123`, `.123456`. */
function fractionEnd(table: NameTable, end: number): number {
  const mark = end < table.ending ? firstPart(table, end).text : '';
  const behind = end + 1;
  if (!/^[._,-]$/.test(mark) || behind >= table.ending || kindOf(table, behind) !== 'digits') return end;
  return hasWidth(table, behind, 3) || hasWidth(table, behind, 6) ? behind + 1 : end;
}

/**
 * Whether the files were changed in the order of their dates, compared among files whose names differ in nothing else.
 * Copied files, changed in one moment or in any order of the machines, say nothing against it.
 */
function agrees(table: NameTable, columns: ReadonlySet<number>, readings: readonly number[]): boolean {
  const groups = new Map<string, number[]>();
  table.rows.forEach((row, index) => {
    const rest = row.map(({ text }, column) => (columns.has(column) ? '' : text)).join('\n');
    groups.set(rest, [...(groups.get(rest) ?? []), index]);
  });
  let right = 0;
  let wrong = 0;
  const changed = (index: number) => (table.files[index] as { mtimeMs: number }).mtimeMs;
  for (const group of groups.values()) {
    group.sort((a, b) => (readings[a] as number) - (readings[b] as number));
    for (let n = 1; n < group.length; n++) {
      const [a, b] = [group[n - 1] as number, group[n] as number];
      if (readings[a] === readings[b] || changed(a) === changed(b)) continue;
      if (changed(a) < changed(b)) right++;
      else wrong++;
    }
  }
  return wrong < 2 || wrong < 0.3 * (right + wrong);
}

function isFixed(table: NameTable, column: number): boolean {
  return column < table.columns && new Set(columnOf(table, column)).size === 1;
}

function hasWidth(table: NameTable, column: number, width: number): boolean {
  return (
    column < table.ending &&
    kindOf(table, column) === 'digits' &&
    columnOf(table, column).every((text) => text.length === width)
  );
}
