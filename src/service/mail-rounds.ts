import { greatestPauseMs } from '../advisory/outbox.ts';
import type { MailSettings } from '../config/site.ts';
import { type DueDelivery, dueDeliveries } from '../store/deliveries.ts';
import { LedgerError } from '../store/ledger-error.ts';
import { hastenWaiting, waitingMail, waitsBeyond } from '../store/waiting-mail.ts';
import { announceStart, type StartKind } from './announce.ts';
import type { Beyond } from './beyond-ledger.ts';
import { type Composed, closeThreads, composeDue } from './compose.ts';
import { type Answered, handOver, keepAnswer } from './delivery.ts';
import { type MailerFor, type MailTools, wallMsOf } from './mail-tools.ts';
import { morning } from './morning.ts';
import { longestOutMs, ServerWatch } from './server-watch.ts';

export type { MailerFor };

export interface MailRound {
  readonly composed: number;
  readonly delivered: number;
  readonly failed: number;
  /** Deliveries that no server has taken yet. */
  readonly waiting: number;
  /** When the next round is worth it; null: when something new happens. */
  readonly againInMs: number | null;
}

/** A round ends after so many attempts, so that a stop or a reload is not held up for long. */
const mostAttempts = 100;
const leastAgainMs = 250;
const ledgerAgainMs = 5_000;
/** Beyond every due time. */
const whenever = Number.MAX_SAFE_INTEGER;

/**
 * Mail in rounds: compose what is due, then one delivery after the other, the most urgent first; before each one it is
 * looked again for what has become due meanwhile, so that a danger never waits behind a slow server's other mails.
 * One round at a time.
 */
export class MailRounds {
  readonly #tools: MailTools;
  readonly #watch: ServerWatch;
  #running: Promise<MailRound> | null = null;
  /** An answer that the ledger could not take yet; nothing is sent before it has. */
  #unstored: Answered | null = null;
  #morning: Promise<string | null> | null = null;

  constructor(tools: MailTools) {
    this.#tools = tools;
    this.#watch = new ServerWatch(() => tools.clock.monotonicMs());
  }

  /** At the start of a run; a clean start is no news. */
  async announce(how: StartKind, beyond: Beyond = { recordings: [], acts: [] }): Promise<void> {
    await this.#unlessLedgerFails(() => announceStart(this.#tools, how, beyond), false);
  }

  /** The morning summary, where it is due: its local date, else null. */
  morning(): Promise<string | null> {
    this.#morning ??= this.#unlessLedgerFails(() => morning(this.#tools), null).finally(() => {
      this.#morning = null;
    });
    return this.#morning;
  }

  /** `flush`: gathering is over, everything decided on leaves now. A round under way is waited for, not doubled. */
  async round(flush = false): Promise<MailRound> {
    if (this.#running !== null) {
      const running = await this.#running;
      if (!flush) return running;
    }
    const nothing = { composed: 0, delivered: 0, failed: 0, waiting: 1, againInMs: ledgerAgainMs };
    this.#running = this.#unlessLedgerFails(() => this.#round(flush), nothing).finally(() => {
      this.#running = null;
    });
    return this.#running;
  }

  /** A ledger that is full or held by somebody else is said, and everything is tried again later. */
  async #unlessLedgerFails<T>(work: () => Promise<T>, otherwise: T): Promise<T> {
    try {
      return await work();
    } catch (error) {
      if (!(error instanceof LedgerError)) throw error;
      this.#tools.complaints.say('ledger', `${error.message}; mails wait`);
      return otherwise;
    }
  }

  async #round(flush: boolean): Promise<MailRound> {
    const counts = { composed: 0, delivered: 0, failed: 0 };
    const { mail } = this.#tools.view().site;
    if (this.#unstored !== null) await this.#keep(this.#unstored);
    await closeThreads(this.#tools);
    let composed: Composed | null = null;
    if (mail !== null) {
      await this.#bringForward(flush);
      let attempts = 0;
      for (; attempts < mostAttempts; attempts++) {
        const onlyDanger = this.#watch.isOut && (await countWaiting(this.#tools)) > 0;
        composed = await composeDue(this.#tools, mail, { flush, onlyDanger });
        counts.composed += composed.messages;
        const due = await this.#next(composed.heldBack, flush && attempts === 0);
        if (due === null) break;
        const outcome = await this.#attempt(mail, due);
        if (outcome.state === 'accepted') counts.delivered++;
        if (outcome.state === 'failed') counts.failed++;
        if (outcome.stop) break;
      }
    }
    const { count, nextDueMs } = await this.#tools.ledger.read(waitingMail);
    return { ...counts, waiting: count, againInMs: this.#againInMs(composed, nextDueMs) };
  }

  async #attempt(mail: MailSettings, due: DueDelivery) {
    const answered = await handOver(this.#tools, mail, due);
    this.#unstored = answered;
    const isBack = this.#watch.note(answered);
    await this.#keep(answered);
    if (isBack) {
      const nowMs = wallMsOf(this.#tools.clock);
      await this.#tools.ledger.transact((writer) =>
        hastenWaiting(writer, { laterThanMs: nowMs, dueMs: nowMs }),
      );
    }
    return { state: answered.next.state, stop: this.#watch.isOut };
  }

  async #keep(answered: Answered): Promise<void> {
    await keepAnswer(this.#tools, answered);
    this.#unstored = null;
  }

  /** What is to be tried now; null: nothing, or the server is out and its pause is not over. */
  async #next(somethingHeldBack: boolean, flush: boolean): Promise<DueDelivery | null> {
    const { ledger, clock } = this.#tools;
    const due = (dueBy: number, limit: number) =>
      ledger.read((reader) => dueDeliveries(reader, dueBy, limit));
    const nowMs = wallMsOf(clock);
    if (!this.#watch.isOut || this.#watch.waitMs === 0 || flush) {
      const [first] = await due(nowMs, 1);
      if (first !== undefined) return first;
    } else if (this.#watch.freshDangerMayTry) {
      const danger = (await due(nowMs, 10)).find(
        ({ message, delivery }) => message.priority === 0 && delivery.tries === 0,
      );
      if (danger !== undefined) return danger;
    }
    if (!somethingHeldBack || !this.#watch.mayProbe) return null;
    return (await due(whenever, 1))[0] ?? null;
  }

  /** No mail waits for a wall clock that was set back; and when everything is to leave now, none waits at all. */
  async #bringForward(all: boolean): Promise<void> {
    const { ledger, clock } = this.#tools;
    const nowMs = wallMsOf(clock);
    const laterThanMs = all ? nowMs : nowMs + greatestPauseMs;
    if (!(await ledger.read((reader) => waitsBeyond(reader, laterThanMs)))) return;
    await ledger.transact((writer) => hastenWaiting(writer, { laterThanMs, dueMs: nowMs }));
  }

  #againInMs(composed: Composed | null, nextDeliveryMs: number | null): number | null {
    if (composed === null) return null;
    const nowMs = wallMsOf(this.#tools.clock);
    const times: number[] = [];
    if (composed.heldBack) times.push(longestOutMs);
    else if (composed.nextDueMs !== null) times.push(composed.nextDueMs - nowMs);
    if (nextDeliveryMs !== null) times.push(Math.max(nextDeliveryMs - nowMs, this.#watch.waitMs));
    return times.length === 0 ? null : Math.max(leastAgainMs, Math.min(...times));
  }
}

async function countWaiting(tools: MailTools): Promise<number> {
  return (await tools.ledger.read(waitingMail)).count;
}
