import type { Answered } from './delivery.ts';

/**
 * What the rounds remember of the mail server, so that one failure is not repeated for every mail that waits. In
 * memory only: a start tries once more. Times are monotonic.
 *
 * - A server that is out ends the round. Two mails in a row during which it went away count as out, too: one alone may be
 *   the mail's own fault, and must not keep the others from being tried.
 * - While it is out, one attempt is made after each pause; a danger that was never tried may break in sooner.
 */
export class ServerWatch {
  readonly #monotonicMs: () => number;
  #outUntilMs: number | null = null;
  #lastTryMs = Number.NEGATIVE_INFINITY;
  #goneInARow = 0;

  constructor(monotonicMs: () => number) {
    this.#monotonicMs = monotonicMs;
  }

  get isOut(): boolean {
    return this.#outUntilMs !== null;
  }

  /** Until the next attempt may be made; 0: now. */
  get waitMs(): number {
    return this.#outUntilMs === null ? 0 : Math.max(0, this.#outUntilMs - this.#monotonicMs());
  }

  /** A danger that was never tried does not wait for the pause, but is not tried every second either. */
  get freshDangerMayTry(): boolean {
    return this.#monotonicMs() - this.#lastTryMs >= breakInAfterMs;
  }

  /** Something new is to be told: worth an attempt with an old mail, long before its own time. */
  get mayProbe(): boolean {
    return this.#monotonicMs() - this.#lastTryMs >= longestOutMs;
  }

  /** Takes note of an attempt; true where the server has just come back. */
  note({ next, answer: { server }, pauseMs }: Answered): boolean {
    this.#lastTryMs = this.#monotonicMs();
    this.#goneInARow = server === 'gone' ? this.#goneInARow + 1 : 0;
    if (server === 'out' || this.#goneInARow >= 2) {
      this.#outUntilMs = this.#lastTryMs + Math.min(pauseMs, longestOutMs);
      return false;
    }
    if (server === 'gone') return false;
    const back = this.#outUntilMs !== null && next.state === 'accepted';
    this.#outUntilMs = null;
    return back;
  }
}

/** While mails wait, a server that is out is asked at least this often. */
export const longestOutMs = 300_000;
const breakInAfterMs = 15_000;
