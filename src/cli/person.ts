import { plain } from '../advisory/escape.ts';

/** Names and texts that people put into the ledger. */
const longestName = 100;
const longestText = 1000;

/** What is wrong with `--by`, `--comment` and the like, in one line; null: nothing. Texts that were not given are null. */
export function textsProblem(texts: Readonly<Record<string, string | null>>): string | null {
  for (const [option, text] of Object.entries(texts)) {
    if (text === null) continue;
    if (text === '') return `--${option} is empty`;
    const longest = option === 'by' ? longestName : longestText;
    if (text.length > longest) return `--${option} is longer than ${longest} characters`;
  }
  return null;
}

/** As it is stored: without control characters and outer spaces. */
export function ownText(text: string | undefined): string | null {
  return text === undefined ? null : plain(text).trim();
}
