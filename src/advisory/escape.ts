/**
 * Foreign text (names from the site file, file names, a server's answer) made harmless: for every reader by `plain`,
 * for HTML by the template `html`, which escapes whatever is not its own markup.
 */

/** Characters that break lines: shown as a space. */
const lineBreaking = /[\t\n\v\f\r\u0085\u2028\u2029]+/g;
/**
 * Characters that are not seen but act: controls, marks and overrides of writing direction, invisible fillers, tags.
 * The joiners U+200C and U+200D stay, several scripts are spelt with them.
 */
const acting =
  /[\u0000-\u001f\u007f-\u009f\u00ad\u061c\u180e\u200b\u200e\u200f\u202a-\u202e\u2060-\u206f\ufeff\ufff9-\ufffb]|[\u{e0000}-\u{e007f}]/gu;

/** One line without anything that acts unseen; each such character is replaced by U+FFFD, so that it is seen. */
export function plain(text: string): string {
  return text
    .replace(/[\ud800-\udfff]/gu, '\ufffd')
    .replace(lineBreaking, ' ')
    .replace(acting, '\ufffd');
}

/** `plain`, and at most `most` characters (code points), the last one an ellipsis where something was cut. */
export function clip(text: string, most: number): string {
  const characters = Array.from(plain(text));
  if (characters.length <= most) return characters.join('');
  return `${characters
    .slice(0, most - 1)
    .join('')
    .trimEnd()}…`;
}

/** Finished HTML; made by `html` only. */
export class Markup {
  readonly source: string;
  constructor(source: string) {
    this.source = source;
  }
}

export type Insertable = string | number | Markup | null | readonly Insertable[];

const entity: Readonly<Record<string, string>> = {
  '&': '&amp;',
  '<': '&lt;',
  '>': '&gt;',
  '"': '&quot;',
  "'": '&#39;',
};

/** Text for an element or a quoted attribute. */
export function escapeHtml(text: string): string {
  return plain(text).replace(/[&<>"']/g, (character) => entity[character] as string);
}

/** Template that escapes every insertion unless it is `Markup`; lists are joined, null is nothing. */
export function html(parts: TemplateStringsArray, ...insertions: readonly Insertable[]): Markup {
  let source = parts[0] as string;
  insertions.forEach((insertion, index) => {
    source += insert(insertion) + (parts[index + 1] as string);
  });
  return new Markup(source);
}

function insert(insertion: Insertable): string {
  if (insertion === null) return '';
  if (insertion instanceof Markup) return insertion.source;
  if (Array.isArray(insertion)) return insertion.map(insert).join('');
  return escapeHtml(String(insertion));
}
