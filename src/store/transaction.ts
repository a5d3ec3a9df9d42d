import { isBusy, LedgerError, toLedgerError } from './ledger-error.ts';
import type { LedgerStep } from './ledger-steps.ts';
import { lend, type PreparedConnection, type Writer } from './lent-connection.ts';

export type AfterCommit = (hook: () => void) => void;

/** Work on the ledger. May run again after `busy`, so it keeps nothing outside; awaits nothing but the ledger. */
export type TransactionWork<T> = (writer: Writer, afterCommit: AfterCommit) => Promise<T>;

export interface TransactionTools {
  readonly path: string;
  readonly begin: 'begin immediate' | 'begin deferred';
  readonly wait: (ms: number) => Promise<void>;
  readonly monotonicMs: () => number;
  readonly step: (name: LedgerStep) => void;
}

/**
 * Pauses between tries when another process holds the ledger. The first twelve are those of SQLite's own busy
 * handler (`delays` in sqliteDefaultBusyCallback, main.c), then 100 ms each; waited for outside the call, where SQLite's
 * would stop the event loop. With 50 ms inside each try about four seconds in all.
 */
export const busyDelaysMs: readonly number[] = [
  ...[1, 2, 5, 10, 15, 20, 25, 25, 25, 50, 50, 100],
  ...Array.from({ length: 18 }, () => 100),
];

/** One after another, in the order asked for. */
export class Queue {
  #last: Promise<unknown> = Promise.resolve();

  run<T>(work: () => Promise<T>): Promise<T> {
    const mine = this.#last.then(work, work);
    this.#last = mine.catch(() => {});
    return mine;
  }

  /** Ends when all that was asked for so far has ended. */
  async drained(): Promise<void> {
    await this.#last;
  }
}

/** Tries again while the answer is `busy`, with the pauses above; other errors of SQLite come out as LedgerError. */
export async function retryWhileBusy<T>(
  tools: Pick<TransactionTools, 'path' | 'wait' | 'monotonicMs'>,
  once: () => Promise<T>,
): Promise<T> {
  const begunMs = tools.monotonicMs();
  for (let tries = 0; ; tries++) {
    try {
      return await once();
    } catch (error) {
      if (!isBusy(error)) throw toLedgerError(error, tools.path);
      const delayMs = busyDelaysMs[tries];
      if (delayMs === undefined) {
        const waitedS = ((tools.monotonicMs() - begunMs) / 1000).toFixed(1);
        throw new LedgerError(
          'busy',
          'SQLITE_BUSY',
          `the ledger ${tools.path} is locked by somebody else: given up after ${tries + 1} tries in ${waitedS} s`,
          error,
        );
      }
      await tools.wait(delayMs);
    }
  }
}

export async function runTransaction<T>(
  prepared: PreparedConnection,
  tools: TransactionTools,
  work: TransactionWork<T>,
): Promise<T> {
  const hooks: (() => void)[] = [];
  const value = await retryWhileBusy(tools, () => {
    hooks.length = 0;
    return runOnce(prepared, tools, work, (hook) => hooks.push(hook));
  });
  runHooks(hooks);
  return value;
}

async function runOnce<T>(
  prepared: PreparedConnection,
  tools: TransactionTools,
  work: TransactionWork<T>,
  afterCommit: AfterCommit,
): Promise<T> {
  const { connection } = prepared;
  connection.exec(tools.begin);
  const lent = lend(prepared);
  const overrun = watchTurn();
  try {
    const value = await Promise.race([work(lent.db, afterCommit), overrun.happened]);
    lent.end();
    tools.step('transaction: before commit');
    connection.exec('commit');
    tools.step('transaction: after commit');
    return value;
  } catch (error) {
    lent.end();
    // SQLite has already rolled back by itself after some errors (disk full, I/O).
    if (connection.inTransaction) connection.exec('rollback');
    throw error;
  } finally {
    overrun.stop();
  }
}

/**
 * Queries of the ledger answer within one turn of the event loop. When a turn ends while the work still goes on, it
 * awaits something else, and would hold the ledger for as long as that takes.
 */
function watchTurn(): { readonly happened: Promise<never>; stop(): void } {
  let immediate: NodeJS.Immediate | undefined;
  const happened = new Promise<never>((_, reject) => {
    immediate = setImmediate(() =>
      reject(new Error('a transaction awaited something other than the ledger; it was rolled back')),
    );
  });
  return { happened, stop: () => clearImmediate(immediate) };
}

function runHooks(hooks: readonly (() => void)[]): void {
  const failures: unknown[] = [];
  for (const hook of hooks) {
    try {
      hook();
    } catch (error) {
      failures.push(error);
    }
  }
  if (failures.length > 0) {
    throw new Error('the transaction is committed, but what should follow it failed', { cause: failures[0] });
  }
}
