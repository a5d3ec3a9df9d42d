import { type Document, isScalar, type Pair, visit } from 'yaml';
import type { SiteText, Span } from './site-text.ts';

/**
 * Traps of the notation itself: lines that YAML refuses, or reads as something else than a technician means. Each
 * finding carries the corrected line, and reading goes on with the corrected text, so that one mistake of this kind
 * does not hide the others. Corrections stay within their line.
 */
export interface Repair extends Span {
  readonly replacement: string;
  readonly what: string;
  /** Where the corrected line alone would not show it. */
  readonly right?: string;
}

/** Keys whose values are paths or patterns: a backslash in double quotes there is never meant as an escape. */
const pathKeys = new Set([
  'drop',
  'data',
  'password_file',
  'files',
  'files_regex',
  'ignore',
  'start_in_name',
]);

/** Repairs that need no parse: tabs in the indentation, and a closing quote eaten by a backslash ("C:\data\"). */
export function lineRepairs(source: SiteText): Repair[] {
  const repairs: Repair[] = [];
  const step = ' '.repeat(indentationStep(source.text));
  for (let number = 1; number <= source.lines; number++) {
    const line = source.line(number);
    const start = source.lineStart(number);
    const indent = /^[ \t]*/.exec(line)?.[0] ?? '';
    if (indent.includes('\t') && !/^\s*(#|$)/.test(line)) {
      repairs.push({
        from: start,
        to: start + indent.length,
        replacement: indent.replaceAll('\t', step),
        what: 'the line is indented by a tab, which YAML does not allow',
        right: `write with spaces: '${indent.replaceAll('\t', step)}${line.slice(indent.length).trimEnd()}'`,
      });
    }
    const quoted = /^(\s*(?:- +)*[\w-]+:\s+)("(?:[^"\\]|\\[^"])*\\")\s*(?:#.*)?$/.exec(line);
    if (quoted !== null && !indent.includes('\t')) {
      const from = start + quoted[1].length;
      repairs.push(unescaped(source.text, { from, to: from + quoted[2].length }));
    }
  }
  return repairs;
}

/** Least indentation in use, 2 where none is. */
function indentationStep(text: string): number {
  let least = Number.POSITIVE_INFINITY;
  for (const match of text.matchAll(/^( {1,8})[^\s#]/gm)) least = Math.min(least, match[1].length);
  return Number.isFinite(least) ? least : 2;
}

/** Repairs of what the parser saw: backslashes in double quotes, colons inside a value. */
export function parsedRepairs(source: SiteText, document: Document): Repair[] {
  const repairs: Repair[] = [];
  const badEscapes = document.errors.filter(({ code }) => code === 'BAD_DQ_ESCAPE').map(({ pos }) => pos[0]);
  visit(document, {
    Pair: (_, pair) => {
      const span = doubleQuoted(pair, source.text);
      if (span === null) return;
      const written = source.text.slice(span.from, span.to);
      const bad = badEscapes.length > 0 && someWithin(badEscapes, span);
      if (!written.includes('\n') && (bad || meansPath(pair, written)))
        repairs.push(unescaped(source.text, span));
    },
  });
  for (const { code, pos } of document.errors) {
    const repair = repairOf(source, code, pos);
    if (repair !== null) repairs.push(repair);
  }
  return withoutOverlaps(repairs);
}

function repairOf(source: SiteText, code: string, pos: readonly [number, number]): Repair | null {
  switch (code) {
    case 'BLOCK_AS_IMPLICIT_KEY':
      return colonInValue(source, pos[0]) ?? gluedColon(source, pos[0]);
    case 'BLOCK_IN_FLOW':
      return colonInBraces(source, pos);
    case 'UNEXPECTED_TOKEN':
    case 'BAD_SCALAR_START':
      return signsInValue(source, pos[0]);
    default:
      return gluedColon(source, pos[0]);
  }
}

/** `name: [west] blower`, `name: 'O'Brien'`: signs that mean something to YAML, where only a text was meant. */
function signsInValue(source: SiteText, offset: number): Repair | null {
  const { line } = source.place(offset);
  const text = source
    .line(line)
    .replace(/\s+#.*$/, '')
    .trimEnd();
  const match = /^(\s*(?:- +)*[\w-]+:\s+)(\S.*)$/.exec(text);
  if (match === null) return null;
  const [, before, value] = match;
  const plain = /^(['"])(.+)\1$/.exec(value)?.[2] ?? value;
  const from = source.lineStart(line) + before.length;
  const what = `'${value.slice(0, 60)}' holds signs that YAML takes for its own`;
  return { from, to: from + value.length, replacement: quoted(plain), what };
}

/** `sorted` ascending: is one of them inside the span? */
function someWithin(sorted: readonly number[], { from, to }: Span): boolean {
  let low = 0;
  let high = sorted.length;
  while (low < high) {
    const middle = (low + high) >> 1;
    if (sorted[middle] < from) low = middle + 1;
    else high = middle;
  }
  return low < sorted.length && sorted[low] < to;
}

function doubleQuoted({ value }: Pair<unknown, unknown>, text: string): Span | null {
  if (!isScalar(value) || value.type !== 'QUOTE_DOUBLE' || !value.range) return null;
  const [from, to] = value.range;
  return /(^|[^\\])(\\\\)*\\[^\\"]/.test(text.slice(from, to)) ? { from, to } : null;
}

function meansPath({ key }: Pair<unknown, unknown>, written: string): boolean {
  const name = isScalar(key) ? String(key.value) : '';
  return pathKeys.has(name) || /^"([A-Za-z]:\\|\.{1,2}\\|\\\\)/.test(written);
}

function unescaped(text: string, { from, to }: Span): Repair {
  const inside = text.slice(from + 1, to - 1).replaceAll('\\\\', '\\');
  return {
    from,
    to,
    replacement: `'${inside.replaceAll("'", "''")}'`,
    what: 'in double quotes a backslash begins an escape (\\n is a new line), so this is not the text that it seems',
  };
}

/** `name: Pump: north` at the offset of 'Pump'. */
function colonInValue(source: SiteText, offset: number): Repair | null {
  const { line, column } = source.place(offset);
  const text = source.line(line);
  const before = text.slice(0, column - 1);
  const value = text
    .slice(column - 1)
    .replace(/\s+#.*$/, '')
    .trimEnd();
  if (!/^\s*(?:- +)*[\w-]+:\s+$/.test(before) || !/:(\s|$)/.test(value)) return null;
  return { from: offset, to: offset + value.length, replacement: quoted(value), what: colonWhat(value) };
}

/** `window:hann`: without the space YAML sees no key at all. */
function gluedColon(source: SiteText, offset: number): Repair | null {
  const { line } = source.place(offset);
  const glued = /^(\s*(?:- +)*[a-z_]+:)(?=[^\s:])/.exec(source.line(line));
  if (glued === null) return null;
  const at = source.lineStart(line) + glued[1].length;
  return { from: at, to: at, replacement: ' ', what: 'the colon lacks its space, so this is no key' };
}

function colonInBraces(source: SiteText, [from, to]: readonly [number, number]): Repair | null {
  const value = source.text.slice(from, to).trimEnd();
  if (value.includes('\n') || !/:(\s|$)/.test(value)) return null;
  return { from, to: from + value.length, replacement: quoted(value), what: colonWhat(value) };
}

function quoted(value: string): string {
  return `'${value.replaceAll("'", "''")}'`;
}

function colonWhat(value: string): string {
  return `the colon in '${value.slice(0, 60)}' begins a new key`;
}

function withoutOverlaps(repairs: Repair[]): Repair[] {
  const kept: Repair[] = [];
  for (const repair of repairs.toSorted((a, b) => a.from - b.from || b.to - a.to)) {
    if (kept.length === 0 || repair.from >= kept[kept.length - 1].to) kept.push(repair);
  }
  return kept;
}

export function applyRepairs(text: string, repairs: readonly Repair[]): string {
  const parts: string[] = [];
  let at = 0;
  for (const { from, to, replacement } of repairs) {
    parts.push(text.slice(at, from), replacement);
    at = to;
  }
  parts.push(text.slice(at));
  return parts.join('');
}
