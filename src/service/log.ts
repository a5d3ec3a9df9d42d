import { type Logger, pino } from 'pino';

export type { Logger } from 'pino';

/** One line of JSON an event; a service manager adds nothing. Secrets are never handed to it. */
export function createLog(destination: { write(line: string): void }): Logger {
  return pino(
    {
      base: null,
      timestamp: pino.stdTimeFunctions.isoTime,
      formatters: { level: (label) => ({ level: label }) },
    },
    destination,
  );
}

/** Logs to nowhere, for one-off commands and tests. */
export const noLog: Logger = pino({ enabled: false });

/**
 * A standing problem is said at most every 30 s, with how often it came meanwhile; a new one at once. Times are
 * monotonic.
 */
export class Complaints {
  readonly #log: Logger;
  readonly #monotonicMs: () => number;
  readonly #last = new Map<string, { saidMs: number; heldBack: number }>();

  constructor(log: Logger, monotonicMs: () => number) {
    this.#log = log;
    this.#monotonicMs = monotonicMs;
  }

  say(about: string, text: string): void {
    const now = this.#monotonicMs();
    const last = this.#last.get(about);
    if (last !== undefined && now - last.saidMs < 30_000) {
      last.heldBack++;
      return;
    }
    this.#log.warn({ about, ...(last?.heldBack ? { times_since: last.heldBack } : {}) }, text);
    this.#last.set(about, { saidMs: now, heldBack: 0 });
  }

  /** The problem is over: the next one is said at once. */
  over(about: string): void {
    this.#last.delete(about);
  }
}
