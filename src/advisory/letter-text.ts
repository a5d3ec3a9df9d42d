import { units } from '../config/units.ts';
import { plain } from './escape.ts';
import type { Block, Letter } from './letter.ts';
import { markWord, type Said, saidText } from './letter.ts';

/** Columns of a text mail: fits a terminal and a phone held sideways. */
const width = 76;
const square = { danger: '■', alert: '□', trouble: '⬚' } as const;

/** A letter as plain text: every line at most 76 characters where words allow; ends with a line break. */
export function letterText(letter: Letter): string {
  const test = letter.test ? 'TEST: this is a test message, nothing has happened.\n\n' : '';
  const head = `${wrap(plain(letter.lead), '', '')}\n${wrap(plain(letter.head), '', '')}\n`;
  const blocks = letter.blocks.filter(({ kind }) => kind !== 'picture');
  const parts = blocks.map((block, index) => {
    const before = blocks[index - 1];
    const close = before?.kind === 'heading' || (before?.kind === 'finding' && block.kind === 'finding');
    return `${close ? '' : '\n'}${blockText(block)}\n`;
  });
  return `${test}${head}${parts.join('')}`;
}

function blockText(block: Block): string {
  switch (block.kind) {
    case 'paragraph':
    case 'closing':
      return wrap(plain(block.text), '', '');
    case 'heading':
      return plain(block.text).toUpperCase();
    case 'command':
      return `    ${plain(block.text)}`;
    case 'finding': {
      const number = block.number === null ? '' : ` ${block.number}`;
      const mark = block.mark === null ? '- ' : `${square[block.mark]} ${markWord[block.mark]}${number}  `;
      const lines = [wrap(plain(block.text), mark, '  ')];
      for (const line of block.more) lines.push(wrap(plain(line), '  ', '  '));
      return lines.join('\n');
    }
    case 'picture':
      return '';
    case 'pairs':
      return pairsText(block.rows);
    case 'table':
      return tableText(block.heads, block.rows);
  }
}

function pairsText(rows: readonly (readonly [string, Said])[]): string {
  const names = rows.map(([name]) => plain(name));
  const column = Math.min(18, Math.max(...names.map((name) => name.length))) + 2;
  return rows
    .map(([, said], index) =>
      wrap(plain(saidText(said)), (names[index] as string).padEnd(column), ' '.repeat(column)),
    )
    .join('\n');
}

/** Columns as wide as their widest cell; rows may be longer than the width, a table broken up is no table. */
function tableText(heads: readonly string[], rows: readonly (readonly Said[])[]): string {
  const all = [heads, ...rows].map((row) => row.map((cell) => plain(saidText(cell))));
  const widths = heads.map((_, column) => Math.max(...all.map((row) => (row[column] ?? '').length)));
  return all
    .map((row) =>
      row
        .map((cell, column) => cell.padEnd(widths[column] ?? 0))
        .join('  ')
        .trimEnd(),
    )
    .join('\n');
}

const unitWords = new Set([...units.map(({ text }) => text), 'r.m.s.']);

/** Words that may part at the end of a line; a number keeps its unit: '3.9 %', '5.21 mm/s r.m.s.'. */
function unbreakable(text: string): string[] {
  const parts: string[] = [];
  for (const word of text.split(' ').filter((part) => part !== '')) {
    const before = parts.at(-1);
    const unit = unitWords.has(word.replace(/[,;:)]+$/, ''));
    if (before !== undefined && unit && /\d$|\d \S+$/.test(before))
      parts[parts.length - 1] = `${before} ${word}`;
    else parts.push(word);
  }
  return parts;
}

/** Breaks at spaces; a word longer than the line stands on a line of its own, whole, so that it can be copied. */
function wrap(text: string, first: string, next: string): string {
  const lines: string[] = [];
  let line = first;
  let empty = true;
  for (const word of unbreakable(text)) {
    if (!empty && line.length + 1 + word.length > width) {
      lines.push(line.trimEnd());
      line = next;
      empty = true;
    }
    line += empty ? word : ` ${word}`;
    empty = false;
  }
  lines.push(line.trimEnd());
  return lines.join('\n');
}
