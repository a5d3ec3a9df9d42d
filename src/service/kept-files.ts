import type { SeenFile } from '../acquisition/sweep.ts';
import type { Ledger } from '../store/ledger.ts';

/** With `after_reading: keep`, what was read stays in the drop folder; here is what it looked like then. */
export class KeptFiles {
  readonly #seen: Map<string, string>;

  private constructor(seen: Map<string, string>) {
    this.#seen = seen;
  }

  static async load(ledger: Ledger): Promise<KeptFiles> {
    const rows = await ledger.read((reader) =>
      reader
        .selectFrom('seen_files')
        .select(['path', 'size_bytes', 'mtime_ms', 'ctime_ms'])
        .orderBy('path')
        .execute(),
    );
    return new KeptFiles(
      new Map(rows.map((row) => [row.path, `${row.size_bytes} ${row.mtime_ms} ${row.ctime_ms}`])),
    );
  }

  /** Read before, and unchanged since: neither opened nor hashed again. */
  has(file: Pick<SeenFile, 'path' | 'size' | 'mtimeMs' | 'ctimeMs'>): boolean {
    return this.#seen.get(file.path) === markOf(file);
  }

  add(file: Pick<SeenFile, 'path' | 'size' | 'mtimeMs' | 'ctimeMs'>): void {
    this.#seen.set(file.path, markOf(file));
  }
}

function markOf(file: Pick<SeenFile, 'size' | 'mtimeMs' | 'ctimeMs'>): string {
  return `${file.size} ${Math.floor(file.mtimeMs)} ${Math.floor(file.ctimeMs)}`;
}
