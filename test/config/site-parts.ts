import { readFileSync } from 'node:fs';
import { loadSite } from '../../src/config/load.ts';
import type { Site } from '../../src/config/site.ts';
import { formatProblem } from '../../src/config/site-text.ts';

const folder = new URL('../files/sites/', import.meta.url);

export const exampleText = readFileSync(new URL('../../config/site.example.yaml', import.meta.url), 'utf8');

export function readList(name: string): string {
  return readFileSync(new URL(name, folder), 'utf8');
}

/** The example with some of its text replaced; each must be there, once or more, and its first is replaced. */
export function exampleWith(...changes: readonly (readonly [from: string, to: string])[]): string {
  let text = exampleText;
  for (const [from, to] of changes) {
    if (!text.includes(from)) throw new Error(`the example has no ${JSON.stringify(from)}`);
    text = text.replace(from, () => to);
  }
  return text;
}

export function siteOf(text: string): Site {
  const answer = loadSite(text, '/srv/plant/site.yaml');
  if (!answer.ok)
    throw new Error(answer.problems.map((problem) => formatProblem('site.yaml', problem)).join('\n'));
  return answer.site;
}

/** Every problem and warning as one line; what the file was accepted with begins with 'warning'. */
export function complaints(text: string): string[] {
  const answer = loadSite(text, '/srv/plant/site.yaml');
  if (!answer.ok) return answer.problems.map((problem) => formatProblem('site.yaml', problem));
  return answer.site.warnings.map(
    ({ line, column, text: told }) => `warning site.yaml:${line}:${column}: ${told}`,
  );
}

export interface ListedCase {
  readonly remark: string;
  readonly lineNumber: number;
  readonly changes: readonly (readonly [string, string])[];
  readonly expected: readonly string[];
}

/**
 * A list of cases: '# ' remark above a group; '- ' text of the example, '+ ' what stands in its place (several lines
 * each, joined), '= ' each complaint expected. A blank line ends a case.
 */
export function listedCases(text: string): ListedCase[] {
  const cases: ListedCase[] = [];
  let remark = '';
  let lineNumber = 0;
  for (const block of text.split(/\n\n+/)) {
    const lines = block.split('\n').filter((line) => line !== '');
    const of = (sign: string) => lines.filter((line) => line[0] === sign).map((line) => line.slice(2));
    if (of('#').length > 0) remark = of('#').join(' ');
    if (of('-').length > 0) {
      const change = [of('-').join('\n'), of('+').join('\n')] as const;
      cases.push({ remark, lineNumber, changes: [change], expected: of('=') });
    }
    lineNumber += block.split('\n').length + 1;
  }
  return cases;
}
