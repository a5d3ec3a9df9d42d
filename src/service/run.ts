import { schedule } from 'node-cron';
import type { Service } from './service.ts';

/** Something that a loop waits on: woken early, or after its time. */
export class Waker {
  #wake: (() => void) | null = null;
  #woken = false;

  wake(): void {
    this.#woken = true;
    this.#wake?.();
  }

  /** Resolves when woken, when the signal aborts, or after `ms`; at once if woken since the last wait. */
  async wait(ms: number, signal: AbortSignal): Promise<void> {
    if (!this.#woken && !signal.aborted) {
      await new Promise<void>((resolve) => {
        const timer = setTimeout(resolve, ms);
        this.#wake = () => {
          clearTimeout(timer);
          resolve();
        };
        signal.addEventListener('abort', this.#wake, { once: true });
      });
      if (this.#wake !== null) signal.removeEventListener('abort', this.#wake);
      this.#wake = null;
    }
    this.#woken = false;
  }
}

/** Between two sweeps that hints ask for: a burst of events is one reason to look. */
const leastBetweenSweepsMs = 500;
/** Commands write to the ledger beside the service; what they left to be told is found within a second. */
const outboxEveryMs = 1_000;

/**
 * Runs a started service until the signal aborts: one loop takes recordings, one sends mail, and a minute tick of
 * node-cron asks whether the morning is due. What is under way is finished before this returns.
 */
export async function runUntil(service: Service, drop: Waker, stop: AbortSignal): Promise<void> {
  const mail = new Waker();
  const broken = new AbortController();
  const signal = AbortSignal.any([stop, broken.signal]);
  askToStopOn(signal, service);
  let minute = true;
  const ticks = schedule('* * * * *', () => {
    minute = true;
    mail.wake();
  });
  const intakeLoop = async () => {
    while (!signal.aborted) {
      const round = await service.intakeRound();
      if (round.taken + round.setAside > 0) mail.wake();
      const { sweepEveryMs } = service.view.site.timings;
      await pauseUntil(leastBetweenSweepsMs, signal);
      await drop.wait(Math.min(round.againInMs ?? sweepEveryMs, sweepEveryMs), signal);
    }
  };
  const mailLoop = async () => {
    while (!signal.aborted) {
      if (minute) {
        minute = false;
        await service.morning();
      }
      const round = await service.mailRound();
      await mail.wait(Math.min(round.againInMs ?? outboxEveryMs, outboxEveryMs), signal);
    }
  };
  // When one loop breaks, the other finishes its round before the error goes on.
  const ended = await Promise.allSettled(
    [intakeLoop, mailLoop].map((loop) =>
      loop().catch((error: unknown) => {
        broken.abort();
        throw error;
      }),
    ),
  );
  await ticks.destroy();
  const failure = ended.find((end) => end.status === 'rejected');
  if (failure !== undefined) throw failure.reason;
}

/** Longest wait of `run --once` for a file that still settles; what takes longer is left for the next time. */
const longestOnceWaitMs = 30_000;

export interface OnceReport {
  readonly taken: number;
  readonly setAside: number;
  /** Files left in the drop folder. */
  readonly left: number;
  /** Mails that no server has taken yet. */
  readonly mailsWaiting: number;
}

/** The service's own way, ended: takes what lies there, evaluates, sends what is due. */
export async function runOnce(service: Service, signal: AbortSignal): Promise<OnceReport> {
  askToStopOn(signal, service);
  let taken = 0;
  let setAside = 0;
  for (;;) {
    const round = await service.intakeRound(false);
    taken += round.taken;
    setAside += round.setAside;
    const { againInMs } = round;
    if (round.waiting === 0 || againInMs === null || againInMs > longestOnceWaitMs || signal.aborted) {
      await service.morning();
      const mail = await service.mailRound(true);
      return { taken, setAside, left: round.waiting, mailsWaiting: mail.waiting };
    }
    await pauseUntil(againInMs + 1, signal);
  }
}

/** So that a round does not go on with its backlog. */
function askToStopOn(signal: AbortSignal, service: Service): void {
  if (signal.aborted) service.askToStop();
  else signal.addEventListener('abort', () => service.askToStop(), { once: true });
}

function pauseUntil(ms: number, signal: AbortSignal): Promise<void> {
  return new Waker().wait(ms, signal);
}
