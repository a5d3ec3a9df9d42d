import { type NameDate, nameDate } from './name-date.ts';
import { columnOf, kindOf, type NamedFile, type NamePart, type NameTable, nameTables } from './name-parts.ts';

/** What a column of a table of names is: the same everywhere, the id of a machine or point, or different every time. */
export type ColumnRole = 'fixed' | 'id' | 'any';

/** Files that one logger wrote of one place: their names differ in date, time and counters only. */
export interface NameSeries {
  readonly files: readonly NamedFile[];
  /** Parts of the first name; what differs is told by `roles`. */
  readonly parts: readonly NamePart[];
  readonly roles: readonly ColumnRole[];
  /** Lengths of the runs of digits in each column, where they are all the same; else null. */
  readonly widths: readonly (number | null)[];
  readonly ending: number;
  /** Of the whole table of names; `readings` are those of these files. */
  readonly date: NameDate | null;
}

/** Values of a machine's or point's id in one table of names; more are taken for something that differs every time. */
const mostSeries = 1000;
/** Runs of digits at least this long, with zeros ahead, are counters. */
const counterWidth = 3;
/** Files of several places that were written in one go. */
const oneMomentMs = 60_000;

/** Files put together by their names, in the order of the paths. */
export function nameSeries(files: readonly NamedFile[]): NameSeries[] {
  return nameTables(files).flatMap((table) => seriesOf(table));
}

function seriesOf(table: NameTable): NameSeries[] {
  const date = nameDate(table);
  const roles = rolesOf(table, date);
  const groups = groupsOf(table, roles);
  return [...groups.values()].map((indices) => {
    const rows = indices.map((index) => table.rows[index] as readonly NamePart[]);
    return {
      files: indices.map((index) => table.files[index] as NamedFile),
      parts: rows[0] as readonly NamePart[],
      roles,
      widths: roles.map((_, column) => sameWidth(table, column)),
      ending: table.ending,
      date:
        date === null ? null : { ...date, readings: indices.map((index) => date.readings[index] as number) },
    };
  });
}

function rolesOf(table: NameTable, date: NameDate | null): ColumnRole[] {
  const roles: ColumnRole[] = Array.from({ length: table.columns }, (_, column) => {
    if (date?.columns.has(column) === true) return 'any';
    return column >= table.ending || kindOf(table, column) === 'mark' ? 'fixed' : roleOf(table, column, date);
  });
  if (date === null) {
    const counter = counterColumn(table, roles);
    if (counter !== null) roles[counter] = 'any';
  }
  // Too many places for one table: what has most values is no id.
  for (;;) {
    const ids = roles.flatMap((role, column) => (role === 'id' ? [column] : []));
    if (ids.length === 0 || groupsOf(table, roles).size <= mostSeries) return roles;
    const most = ids.reduce((a, b) => (distinct(table, b) > distinct(table, a) ? b : a));
    roles[most] = 'any';
  }
}

function roleOf(table: NameTable, column: number, date: NameDate | null): ColumnRole {
  const values = distinct(table, column);
  const count = table.files.length;
  if (values === 1) return 'fixed';
  const repeats = values <= count / 2;
  if (kindOf(table, column) === 'letters') return repeats || values <= 30 ? 'id' : 'any';
  if (repeats) return 'id';
  if (date === null) return 'id';
  // Digits that never come again: behind the date a counter or a fraction, ahead of it perhaps a machine's number.
  const counts = isPadded(table, column) || (count >= 8 && risesWith(table, column, date.readings));
  return column > date.last || counts ? 'any' : 'id';
}

/**
 * Without a date, the column of digits that differs from recording to recording; null where none does. One that never
 * comes again, else the one whose equal values lie closest together in time.
 */
function counterColumn(table: NameTable, roles: readonly ColumnRole[]): number | null {
  const digits = roles.flatMap((_, column) =>
    column < table.ending && kindOf(table, column) === 'digits' ? [column] : [],
  );
  const varying = digits.filter((column) => distinct(table, column) > 1);
  if (varying.length === 0) return digits.findLast((column) => isPadded(table, column)) ?? null;
  const scored = varying.map((column) => ({
    column,
    values: distinct(table, column),
    spanMs: spanOfEqual(table, column),
  }));
  const best = scored.reduce((a, b) => (isBetterCounter(b, a) ? b : a));
  const few = best.values <= 20 && !isPadded(table, best.column) && spanOfAll(table) <= oneMomentMs;
  const repeats = best.values <= table.files.length / 2;
  // Short numbers of files that came in one moment are machines or points, not recordings.
  return few && (varying.length === 1 || !repeats) ? null : best.column;
}

interface Scored {
  readonly column: number;
  readonly values: number;
  readonly spanMs: number;
}

function isBetterCounter(one: Scored, other: Scored): boolean {
  if (one.spanMs !== other.spanMs) return one.spanMs < other.spanMs;
  return one.values >= other.values;
}

/** Mean of the time spans between files with equal values. */
function spanOfEqual(table: NameTable, column: number): number {
  const spans = new Map<string, { from: number; to: number }>();
  columnOf(table, column).forEach((value, index) => {
    const at = (table.files[index] as NamedFile).mtimeMs;
    const span = spans.get(value);
    if (span === undefined) spans.set(value, { from: at, to: at });
    else {
      span.from = Math.min(span.from, at);
      span.to = Math.max(span.to, at);
    }
  });
  const total = [...spans.values()].reduce((sum, { from, to }) => sum + to - from, 0);
  return Math.round(total / spans.size);
}

function spanOfAll({ files }: NameTable): number {
  const times = files.map(({ mtimeMs }) => mtimeMs);
  return Math.max(...times) - Math.min(...times);
}

function isPadded(table: NameTable, column: number): boolean {
  const values = columnOf(table, column);
  const width = values[0]?.length ?? 0;
  return width >= counterWidth && values.every((text) => text.length === width);
}

function risesWith(table: NameTable, column: number, readings: readonly number[]): boolean {
  const order = readings
    .map((_, index) => index)
    .sort((a, b) => (readings[a] as number) - (readings[b] as number));
  const values = columnOf(table, column).map(Number);
  return order.every(
    (index, n) => n === 0 || (values[index] as number) > (values[order[n - 1] as number] as number),
  );
}

function groupsOf(table: NameTable, roles: readonly ColumnRole[]): Map<string, number[]> {
  const groups = new Map<string, number[]>();
  table.rows.forEach((row, index) => {
    const key = row.map(({ text }, column) => (roles[column] === 'id' ? text : '')).join('\n');
    const group = groups.get(key);
    if (group === undefined) groups.set(key, [index]);
    else group.push(index);
  });
  return groups;
}

function distinct(table: NameTable, column: number): number {
  return new Set(columnOf(table, column)).size;
}

function sameWidth(table: NameTable, column: number): number | null {
  const widths = new Set(columnOf(table, column).map((text) => text.length));
  return widths.size === 1 ? ((widths.values().next().value as number) ?? null) : null;
}
