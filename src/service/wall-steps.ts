import type { Ledger } from '../store/ledger.ts';
import { LedgerError } from '../store/ledger-error.ts';
import { carryArrivals, noArrivalAfter } from '../store/sources.ts';
import { carryShelves, noShelfAfter } from '../store/suppressions.ts';
import type { Clock } from './clock.ts';
import type { Complaints, Logger } from './log.ts';

/**
 * Notices that somebody set the machine's clock while the service runs (or that the machine slept): wall time has gone
 * on by another amount than monotonic time. The arrivals in the ledger, by which silence is judged, are carried over
 * to what the clock shows now. Otherwise a step forward would call every point overdue at once, and after a step back
 * no silence would be noticed before the clock has caught up. Shelves are carried over with them: eight hours stay eight
 * hours. What is out of service ends at the time that a person named, as the clock shows it.
 *
 * What happens to the clock while the service is off cannot be seen; but no arrival can be one to come.
 */
export interface WallStepsTools {
  readonly ledger: Ledger;
  readonly clock: Clock;
  readonly log: Logger;
  readonly complaints: Complaints;
}

/** Less is a clock that is kept right by small corrections. */
const leastStepMs = 30_000;

export class WallSteps {
  readonly #tools: WallStepsTools;
  readonly #begunMs: number;
  #wallMs: number;
  #monotonicMs: number;
  #uncarriedMs = 0;
  #isFirst = true;

  constructor(tools: WallStepsTools) {
    this.#tools = tools;
    this.#wallMs = tools.clock.wallMs();
    this.#monotonicMs = tools.clock.monotonicMs();
    this.#begunMs = this.#monotonicMs;
  }

  /** When this run began, as the clock shows it since it was last set. */
  get startedMs(): number {
    const { clock } = this.#tools;
    return Math.round(clock.wallMs() - (clock.monotonicMs() - this.#begunMs));
  }

  /** Before anything is decided on in a round. */
  async look(): Promise<void> {
    const { ledger, clock, log, complaints } = this.#tools;
    const [wallMs, monotonicMs] = [clock.wallMs(), clock.monotonicMs()];
    const byMs = Math.round(wallMs - this.#wallMs - (monotonicMs - this.#monotonicMs));
    this.#wallMs = wallMs;
    this.#monotonicMs = monotonicMs;
    if (Math.abs(byMs) >= leastStepMs) {
      this.#uncarriedMs += byMs;
      const minutes = Math.round(Math.abs(byMs) / 60_000);
      log.warn(`the clock of this machine went ${byMs > 0 ? 'forward' : 'back'} by ${minutes} min`);
    }
    if (this.#uncarriedMs === 0 && !this.#isFirst) return;
    try {
      const carriedMs = this.#uncarriedMs;
      await ledger.transact(async (writer) => {
        if (carriedMs !== 0) {
          await carryArrivals(writer, carriedMs);
          await carryShelves(writer, carriedMs);
        }
        if (this.#isFirst) {
          await noArrivalAfter(writer, Math.round(wallMs));
          await noShelfAfter(writer, Math.round(wallMs));
        }
      });
      this.#uncarriedMs = 0;
      this.#isFirst = false;
    } catch (error) {
      if (!(error instanceof LedgerError)) throw error;
      complaints.say('ledger', error.message);
    }
  }
}
