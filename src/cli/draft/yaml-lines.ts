/** One line of a site file; `note` becomes a comment behind it. */
export interface YamlLine {
  readonly indent: number;
  readonly text: string;
  readonly note: string | null;
}

/** Comments of a paragraph stand under each other, unless a line is longer than this. */
const furthestComment = 48;

export const mark = 'please confirm';

/**
 * `note` null: nothing to say. `guess`: marked as one; the note is a comment of its own behind the mark, so that the
 * file stays sound when all marks are taken away by search and replace.
 */
export function line(indent: number, text: string, note: string | null = null, guess = false): YamlLine {
  if (!guess) return { indent, text, note };
  return { indent, text, note: note === null ? mark : `${mark} # ${note}` };
}

export const blank: YamlLine = { indent: 0, text: '', note: null };

export function yamlText(lines: readonly YamlLine[]): string {
  const written: string[] = [];
  let from = 0;
  while (from < lines.length) {
    let to = from;
    while (to < lines.length && lines[to]?.text !== '') to++;
    const paragraph = lines.slice(from, to);
    const widths = paragraph
      .filter(({ note }) => note !== null)
      .map(({ indent, text }) => indent + text.length)
      .filter((width) => width <= furthestComment);
    const column = Math.max(0, ...widths) + 2;
    for (const { indent, text, note } of paragraph) {
      const whole = `${' '.repeat(indent)}${text}`;
      written.push(note === null ? whole : `${whole.padEnd(column - 2)}  # ${note}`);
    }
    if (to < lines.length) written.push('');
    from = to + 1;
  }
  return `${written.join('\n').replace(/\n+$/, '')}\n`;
}
