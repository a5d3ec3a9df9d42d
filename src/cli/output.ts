import type { Writable } from 'node:stream';
import { plain } from '../advisory/escape.ts';

/** How commands write: aligned tables for people, JSON and CSV for programs. */

/** Widest line of a table on paper, in a mail or in a terminal as it is opened. */
export const lineWidth = 80;

export interface Column {
  readonly title: string;
  /** Numbers stand to the right. */
  readonly right?: boolean;
  /** Takes the room that is left and breaks its text into lines; at most one column. */
  readonly wraps?: boolean;
}

const gap = '  ';
const leastWrapped = 16;

/** Cells of the columns; or a text that runs beneath the row before it. */
export type Row = readonly string[] | { readonly beneath: string };

/**
 * Rows under their titles, columns aligned, in lines of at most `width` as far as the columns that do not wrap allow.
 * Texts come from files and people: whatever would act on a terminal is made visible. `indent`: of texts beneath;
 * without it they begin at the second column.
 */
export function table(
  columns: readonly Column[],
  rows: readonly Row[],
  width: number = lineWidth,
  indent?: number,
): string {
  const cellsOf = (row: readonly string[]) => columns.map((_, n) => plain(row[n] ?? ''));
  const cells = rows.map((row) => ('beneath' in row ? row : cellsOf(row)));
  const widths = columnWidths(
    columns,
    cells.filter((row): row is string[] => !('beneath' in row)),
    width,
  );
  const wrapped = columns.findIndex(({ wraps }) => wraps === true);
  const line = (row: readonly string[]) =>
    row
      .map((cell, n) => pad(cell, widths[n] ?? 0, columns[n]?.right === true))
      .join(gap)
      .trimEnd();
  const margin = ' '.repeat(indent ?? (widths[0] ?? 0) + gap.length);
  const body = cells.flatMap((row) => {
    if ('beneath' in row)
      return wrapText(plain(row.beneath), width - margin.length).map((part) => margin + part);
    const parts = wrapped === -1 ? [''] : wrapText(row[wrapped] ?? '', widths[wrapped] ?? 0);
    return parts.map((part, n) =>
      line(row.map((cell, column) => (column === wrapped ? part : n === 0 ? cell : ''))),
    );
  });
  return `${[line(columns.map(({ title }) => title)), ...body].join('\n')}\n`;
}

function columnWidths(
  columns: readonly Column[],
  rows: readonly (readonly string[])[],
  width: number,
): number[] {
  const widths = columns.map(({ title }, n) =>
    Math.max(title.length, ...rows.map((row) => textWidth(row[n] ?? ''))),
  );
  const wrapped = columns.findIndex(({ wraps }) => wraps === true);
  if (wrapped === -1) return widths;
  const others = widths.reduce((sum, one, n) => sum + gap.length + (n === wrapped ? 0 : one), -gap.length);
  widths[wrapped] = Math.min(widths[wrapped] ?? 0, Math.max(leastWrapped, width - others));
  return widths;
}

/** Text in lines of at most `width`, broken at spaces, else behind / or -, else where the width ends. */
export function wrapText(text: string, width: number): string[] {
  const lines: string[] = [];
  let rest = text;
  while (textWidth(rest) > width) {
    const head = Array.from(rest)
      .slice(0, width + 1)
      .join('');
    const space = head.lastIndexOf(' ');
    const mark = Math.max(head.lastIndexOf('/', head.length - 2), head.lastIndexOf('-', head.length - 2)) + 1;
    const cut = space > 0 ? space : mark > 0 ? mark : Array.from(rest).slice(0, width).join('').length;
    lines.push(rest.slice(0, cut));
    rest = rest.slice(cut).trimStart();
  }
  return [...lines, rest];
}

/** Lines of 'title  text', the text wrapped beside its title. */
export function listing(entries: readonly (readonly [title: string, text: string])[], indent = ''): string {
  const left = Math.max(...entries.map(([title]) => title.length)) + gap.length;
  return entries
    .flatMap(([title, text]) =>
      wrapText(plain(text), lineWidth - indent.length - left).map((part, n) =>
        `${indent}${(n === 0 ? title : '').padEnd(left)}${part}`.trimEnd(),
      ),
    )
    .map((line) => `${line}\n`)
    .join('');
}

/** One value as JSON, indented; lists of plain numbers stay on one line, so that a spectrum is not a page a line. */
export function writeJson(out: Writable, value: unknown): void {
  out.write(`${jsonText(value, '')}\n`);
}

function jsonText(value: unknown, indent: string): string {
  const inner = `${indent}  `;
  if (Array.isArray(value)) {
    if (value.every((item) => typeof item !== 'object' || item === null)) return JSON.stringify(value);
    return `[\n${value.map((item) => inner + jsonText(item, inner)).join(',\n')}\n${indent}]`;
  }
  if (typeof value !== 'object' || value === null) return JSON.stringify(value) ?? 'null';
  const entries = Object.entries(value).filter(([, item]) => item !== undefined);
  if (entries.length === 0) return '{}';
  return `{\n${entries.map(([key, item]) => `${inner}${JSON.stringify(key)}: ${jsonText(item, inner)}`).join(',\n')}\n${indent}}`;
}

/** One line of CSV (RFC 4180). A text that a spreadsheet would take for a formula gets an apostrophe before it. */
export function csvLine(cells: readonly (string | number | boolean | null)[]): string {
  return `${cells.map(csvCell).join(',')}\r\n`;
}

function csvCell(cell: string | number | boolean | null): string {
  if (cell === null) return '';
  if (typeof cell !== 'string') return String(cell);
  const text = /^\s*[=+\-@]|^[\t\r\n]/.test(cell) ? `'${cell}` : cell;
  return /[",\r\n]/.test(text) ? `"${text.replaceAll('"', '""')}"` : text;
}

/** Characters, not code units. */
function textWidth(text: string): number {
  return Array.from(text).length;
}

function pad(text: string, width: number, right: boolean): string {
  const missing = ' '.repeat(Math.max(0, width - textWidth(text)));
  return right ? missing + text : text + missing;
}
