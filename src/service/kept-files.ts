import type { SeenFile } from '../acquisition/sweep.ts';
import { forgetSeen } from '../store/intake-marks.ts';
import type { Ledger } from '../store/ledger.ts';

type Look = Pick<SeenFile, 'path' | 'size' | 'mtimeMs' | 'ctimeMs'>;

const hourMs = 3_600_000;
/** A share that is away for a night must not have everything on it read again. */
const forgottenAfterMs = 24 * hourMs;
const forgottenAtOnce = 500;

/**
 * With `after_reading: keep`, what was read stays in the drop folder; here is what it looked like then. A file that the
 * logger has taken away is forgotten after a day.
 */
export class KeptFiles {
  readonly #monotonicMs: () => number;
  readonly #kept = new Map<string, { readonly mark: string; seenMs: number }>();
  #lookedMs: number;

  private constructor(monotonicMs: () => number) {
    this.#monotonicMs = monotonicMs;
    this.#lookedMs = monotonicMs();
  }

  static async load(ledger: Ledger, monotonicMs: () => number): Promise<KeptFiles> {
    const rows = await ledger.read((reader) =>
      reader
        .selectFrom('seen_files')
        .select(['path', 'size_bytes', 'mtime_ms', 'ctime_ms'])
        .orderBy('path')
        .execute(),
    );
    const kept = new KeptFiles(monotonicMs);
    for (const { path, size_bytes: size, mtime_ms: mtimeMs, ctime_ms: ctimeMs } of rows)
      kept.add({ path, size, mtimeMs, ctimeMs });
    return kept;
  }

  /** Read before, and unchanged since: neither opened nor hashed again. */
  has(file: Look): boolean {
    const known = this.#kept.get(file.path);
    if (known === undefined) return false;
    known.seenMs = this.#monotonicMs();
    return known.mark === markOf(file);
  }

  add(file: Look): void {
    this.#kept.set(file.path, { mark: markOf(file), seenMs: this.#monotonicMs() });
  }

  /** Once an hour, after a sweep. */
  async forgetGone(ledger: Ledger): Promise<void> {
    const nowMs = this.#monotonicMs();
    if (nowMs - this.#lookedMs < hourMs) return;
    const gone = [...this.#kept].filter(([, { seenMs }]) => nowMs - seenMs > forgottenAfterMs);
    for (let n = 0; n < gone.length; n += forgottenAtOnce) {
      const part = gone.slice(n, n + forgottenAtOnce);
      await ledger.transact(async (writer) => {
        for (const [path] of part) await forgetSeen(writer, path);
      });
      for (const [path] of part) this.#kept.delete(path);
    }
    this.#lookedMs = nowMs;
  }
}

function markOf(file: Omit<Look, 'path'>): string {
  return `${file.size} ${Math.floor(file.mtimeMs)} ${Math.floor(file.ctimeMs)}`;
}
