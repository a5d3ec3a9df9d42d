/**
 * The effects of the service on the world outside, each of which can be made to fail once: commits of the ledger, renames,
 * removals, folders, copies and written files of filing, and mails. They are counted in the order in which they happen.
 */
export type EffectKind = 'commit' | 'files' | 'send';

class Effects {
  /** What was done, in order. */
  readonly done: string[] = [];
  #failing: number | null = null;
  failed: string | null = null;
  #armed = false;

  /** Counts from here on; the n-th effect fails, null: none does. */
  begin(failing: number | null): void {
    this.done.length = 0;
    this.#failing = failing;
    this.failed = null;
    this.#armed = true;
  }

  end(): void {
    this.#armed = false;
  }

  /** True where the effect that is about to happen is to fail. */
  fails(name: string): boolean {
    if (!this.#armed) return false;
    this.done.push(name);
    if (this.done.length - 1 !== this.#failing) return false;
    this.failed = name;
    return true;
  }
}

export const effects = new Effects();

export function systemError(code: string, syscall: string, path: string): Error {
  return Object.assign(new Error(`${code}: ${syscall} '${path}'`), { code, syscall, path });
}
