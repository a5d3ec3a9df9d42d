import type { Ledger } from '../store/ledger.ts';
import { LedgerError } from '../store/ledger-error.ts';
import type { Clock } from './clock.ts';
import type { Round } from './intake.ts';
import type { Complaints } from './log.ts';
import type { SiteView } from './site-view.ts';
import type { WallSteps } from './wall-steps.ts';
import { watchSilence } from './watch-silence.ts';
import { watchSuppressions } from './watch-suppressions.ts';

/**
 * What is looked at around every round of intake, whether or not a recording came: clocks, silence, suppressions; and the
 * work for quiet moments. A ledger that fails is said, and all of it is looked at again in the next round.
 */
export interface WatchesTools {
  readonly ledger: Ledger;
  readonly clock: Clock;
  readonly view: () => SiteView;
  readonly complaints: Complaints;
  readonly wallSteps: WallSteps;
}

export class Watches {
  readonly #tools: WatchesTools;

  constructor(tools: WatchesTools) {
    this.#tools = tools;
  }

  /** Before a recording is judged: what has ended by then holds nothing back. */
  async before(): Promise<void> {
    await this.#tools.wallSteps.look();
    await this.#unlessLedgerFails(() => this.#suppressions());
  }

  /** Returns the round, which comes again in time for the next end of a shelf or of a place out of service. */
  async after(round: Round, whenIdle: () => Promise<void>): Promise<Round> {
    const { ledger, view, clock, wallSteps } = this.#tools;
    let endsInMs: number | null = null;
    await this.#unlessLedgerFails(async () => {
      await watchSilence(ledger, view(), {
        wallMs: Math.round(clock.wallMs()),
        startedMs: wallSteps.startedMs,
        waitingFor: round.waitingFor,
        dropFolderReadable: round.dropFolder === 'read',
      });
      endsInMs = await this.#suppressions();
      if (round.waiting === 0 || round.taken === 0) await whenIdle();
    });
    if (endsInMs === null) return round;
    return { ...round, againInMs: Math.min(round.againInMs ?? endsInMs, endsInMs) };
  }

  /** In how many milliseconds the next one ends; null: none does. */
  async #suppressions(): Promise<number | null> {
    const { ledger, view, clock } = this.#tools;
    const wallMs = Math.round(clock.wallMs());
    const endMs = await watchSuppressions(ledger, view(), wallMs);
    return endMs === null ? null : Math.max(0, endMs - wallMs);
  }

  async #unlessLedgerFails(work: () => Promise<unknown>): Promise<void> {
    try {
      await work();
    } catch (error) {
      if (!(error instanceof LedgerError)) throw error;
      this.#tools.complaints.say('ledger', error.message);
    }
  }
}
