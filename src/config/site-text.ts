import type { SiteRemark } from './site.ts';

/** Offsets into the text of the site file. */
export interface Span {
  readonly from: number;
  readonly to: number;
}

/** One thing wrong with the site file; `right` says what would be right, with the corrected line where there is one. */
export interface SiteProblem {
  readonly line: number;
  readonly column: number;
  readonly what: string;
  readonly right: string;
}

/** `file:line:column: what is wrong; what would be right`. */
export function formatProblem(file: string, { line, column, what, right }: SiteProblem): string {
  return `${file}:${line}:${column}: ${what}; ${right}`;
}

/** Problems told of one file; the rest is counted. A file with more is not a site file. */
const mostProblems = 200;
const longestLine = 160;

/** The text, its lines, and what was found in it so far. Lines and columns count from 1. */
export class SiteText {
  readonly text: string;
  readonly #starts: number[] = [0];
  readonly #problems: SiteProblem[] = [];
  readonly #warnings: SiteRemark[] = [];
  readonly #told = new Set<string>();
  #more = 0;

  constructor(text: string) {
    this.text = text;
    for (let at = text.indexOf('\n'); at >= 0; at = text.indexOf('\n', at + 1)) this.#starts.push(at + 1);
  }

  get lines(): number {
    return this.#starts.length;
  }

  place(offset: number): { readonly line: number; readonly column: number } {
    const at = Math.max(0, Math.min(offset, this.text.length));
    let low = 0;
    let high = this.#starts.length - 1;
    while (low < high) {
      const middle = (low + high + 1) >> 1;
      if (this.#starts[middle] <= at) low = middle;
      else high = middle - 1;
    }
    return { line: low + 1, column: at - this.#starts[low] + 1 };
  }

  /** Line `number` without its end. */
  line(number: number): string {
    const from = this.#starts[number - 1];
    const to = number < this.#starts.length ? this.#starts[number] : this.text.length;
    return this.text.slice(from, to).replace(/\r?\n$/, '');
  }

  lineStart(number: number): number {
    return this.#starts[number - 1];
  }

  /**
   * The line of `span` with its text replaced, as it should be typed; without the indentation, and without a comment
   * that follows. A span over several lines ends with its first.
   */
  corrected({ from, to }: Span, replacement: string): string {
    const { line, column } = this.place(from);
    const text = this.line(line);
    const end = Math.min(text.length, column - 1 + Math.max(0, to - from));
    const after = text.slice(end).replace(/\s+#.*$/, '');
    const whole = `${text.slice(0, column - 1)}${replacement}${after}`.trim();
    if (whole.length <= longestLine) return whole;
    const key = /[\w-]+:\s*$/.exec(text.slice(0, column - 1))?.[0] ?? '';
    return `${key}${replacement}`.slice(0, longestLine);
  }

  problem(span: Span, what: string, right: string, once?: string): void {
    const place = this.place(span.from);
    if (!this.#first(`${place.line}:${place.column}:${once ?? what}`)) return;
    if (this.#problems.length >= mostProblems) this.#more++;
    else this.#problems.push({ ...place, what, right });
  }

  warn(span: Span, text: string, once?: string): void {
    const place = this.place(span.from);
    if (!this.#first(`warn ${place.line}:${place.column}:${once ?? text}`)) return;
    if (this.#warnings.length < mostProblems) this.#warnings.push({ ...place, text });
  }

  /** In the order of the file. */
  problems(): readonly SiteProblem[] {
    const sorted = this.#problems.toSorted((a, b) => a.line - b.line || a.column - b.column);
    if (this.#more === 0) return sorted;
    const { line, column } = sorted[sorted.length - 1];
    return [
      ...sorted,
      { line, column, what: `${this.#more} more problems follow`, right: 'solve these first' },
    ];
  }

  warnings(): readonly SiteRemark[] {
    return this.#warnings.toSorted((a, b) => a.line - b.line || a.column - b.column);
  }

  #first(key: string): boolean {
    if (this.#told.has(key)) return false;
    this.#told.add(key);
    return true;
  }
}

/** A text as it must stand in YAML: in single quotes where a plain one would be read as something else. */
export function asYaml(text: string, inBraces = false): string {
  const risky =
    text === '' ||
    text !== text.trim() ||
    /^[-?:,[\]{}#&*!|>'"%@`]/.test(text) ||
    /: |:$|\s#/.test(text) ||
    /^\d+:\d/.test(text) ||
    (inBraces && /[,[\]{}]/.test(text));
  return risky ? `'${text.replaceAll("'", "''")}'` : text;
}
