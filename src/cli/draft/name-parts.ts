/**
 * File names taken apart: runs of letters, runs of digits, and single marks. Files whose names have the same structure
 * can be compared part by part, like the columns of a table.
 */
export interface NamePart {
  readonly kind: 'letters' | 'digits' | 'mark';
  readonly text: string;
}

/** A file as it lies in the folder; `path` below it, with `/`. */
export interface NamedFile {
  readonly path: string;
  readonly mtimeMs: number;
}

/** Files whose names have the same structure; `rows` are their parts, all of one length. */
export interface NameTable {
  readonly files: readonly NamedFile[];
  readonly rows: readonly (readonly NamePart[])[];
  readonly columns: number;
  /** Column from which on the ending of the name stands (its dot, then letters or digits); `columns` where there is none. */
  readonly ending: number;
}

export function nameParts(path: string): NamePart[] {
  return Array.from(path.matchAll(/(\p{L}+)|([0-9]+)|[^\p{L}0-9]/gu), ([text, letters, digits]) => ({
    kind: letters !== undefined ? 'letters' : digits !== undefined ? 'digits' : 'mark',
    text,
  }));
}

/** One table a structure, in the order of the paths. Endings are compared letter by letter, so WAV and CSV stay apart. */
export function nameTables(files: readonly NamedFile[]): NameTable[] {
  const found = new Map<string, { files: NamedFile[]; rows: NamePart[][]; ending: number }>();
  for (const file of files) {
    const row = nameParts(file.path);
    const ending = endingColumn(row);
    const body = row.map(({ kind, text }, n) =>
      n >= ending || kind === 'mark' ? text : kind === 'letters' ? 'a' : '0',
    );
    const key = body.join('\n');
    const table = found.get(key);
    if (table === undefined) found.set(key, { files: [file], rows: [row], ending });
    else {
      table.files.push(file);
      table.rows.push(row);
    }
  }
  return [...found.values()].map((table) => ({ ...table, columns: (table.rows[0] as NamePart[]).length }));
}

/** `.wav`, `.csv`, `.mp3`: a dot and up to two parts behind it, the first not before the name began. */
function endingColumn(row: readonly NamePart[]): number {
  const dot = row.findLastIndex(({ text }) => text === '.');
  const before = row[dot - 1];
  if (dot <= 0 || before === undefined || before.text === '/' || row.length - dot > 3) return row.length;
  const behind = row.slice(dot + 1);
  const plain = behind.length > 0 && behind.every(({ kind }) => kind !== 'mark');
  return plain && behind.some(({ kind }) => kind === 'letters') ? dot : row.length;
}

/** Values of one column, one a file. */
export function columnOf({ rows }: NameTable, column: number): string[] {
  return rows.map((row) => (row[column] as NamePart).text);
}

export function kindOf(table: NameTable, column: number): NamePart['kind'] {
  return firstPart(table, column).kind;
}

/** What the first name has there: of a fixed column what all have. */
export function firstPart({ rows }: NameTable, column: number): NamePart {
  const part = rows[0]?.[column];
  if (part === undefined) throw new Error(`a table of names has no column ${column}`);
  return part;
}
