import { readFileSync } from 'node:fs';

/** Rows of a list in test/files/names: columns between ` | `; remarks begin with #. */
export function listOf(name: string): string[][] {
  const text = readFileSync(new URL(`../files/names/${name}`, import.meta.url), 'utf8');
  const lines = text.split('\n').filter((line) => line !== '' && !line.startsWith('#'));
  return lines.map((line) => line.split(' | '));
}
