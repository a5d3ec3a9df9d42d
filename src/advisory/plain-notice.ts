import { escapeHtml, plain } from './escape.ts';
import type { Mail } from './facts.ts';
import { caution } from './wording.ts';

/** What is known without any calculation; enough to know where to look. */
export interface PlainLine {
  readonly number: number | null;
  readonly severity: string;
  /** Machine, point, band and limit, or the kind of trouble. */
  readonly about: string;
  readonly event: string;
  /** In SI units. */
  readonly level: number | null;
}

/** In place of a message whose full text could not be composed: news without explanation rather than none. */
export function plainNotice(
  siteName: string,
  title: string,
  lines: readonly PlainLine[],
  error: unknown,
): Mail {
  const said = plain(String(error)).slice(0, 300);
  const text = [
    plain(siteName),
    title,
    '',
    ...lines.map(lineText),
    '',
    `The full text could not be composed: ${said}`,
    '',
    caution,
    '',
  ].join('\n');
  return {
    subject: plain(`${siteName}: ${title}`).slice(0, 150),
    text,
    html: `<!doctype html><html lang="en"><meta charset="utf-8"><body>${text
      .split('\n')
      .map((line) => `<div>${escapeHtml(line)}&nbsp;</div>`)
      .join('')}</body></html>`,
  };
}

function lineText({ number, severity, about, event, level }: PlainLine): string {
  const numbered = number === null ? '' : ` ${number}`;
  const measured = level === null ? '' : `, level ${level} in SI units`;
  return `${severity.toUpperCase()}${numbered}: ${plain(about)}: ${event}${measured}`;
}
