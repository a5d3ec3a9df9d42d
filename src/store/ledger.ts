import { statSync } from 'node:fs';
import type { Database } from 'better-sqlite3';
import { PreparedConnection, type Reader } from './lent-connection.ts';
import type { OwnerLock } from './owner-lock.ts';
import {
  Queue,
  retryWhileBusy,
  runTransaction,
  type TransactionTools,
  type TransactionWork,
} from './transaction.ts';

/** `owner`: the service, alone, migrates; `guest`: another command, short transactions; `reader`: never writes. */
export type LedgerMode = 'owner' | 'guest' | 'reader';

export interface CheckpointState {
  /** False when a reader or another process kept part of the log from being moved. */
  readonly complete: boolean;
  readonly walBytes: number;
}

export interface LedgerParts {
  readonly folder: string;
  readonly path: string;
  readonly mode: LedgerMode;
  readonly id: string;
  readonly version: number;
  readonly reading: Database;
  /** Null for readers. */
  readonly writing: Database | null;
  readonly lock: OwnerLock | null;
  readonly tools: Omit<TransactionTools, 'begin' | 'path'>;
}

/**
 * The open ledger: one writing connection lent to one transaction at a time, one reading connection. Writing exists
 * only inside `transact`. Both serve in the order they were asked.
 */
export class Ledger {
  readonly folder: string;
  readonly path: string;
  readonly mode: LedgerMode;
  /** Random name of this ledger, for ever; part of every Message-ID. */
  readonly id: string;
  readonly version: number;
  readonly #reading: PreparedConnection;
  readonly #writing: PreparedConnection | null;
  readonly #lock: OwnerLock | null;
  readonly #tools: Omit<TransactionTools, 'begin'>;
  readonly #readQueue = new Queue();
  readonly #writeQueue = new Queue();
  #closed = false;

  constructor(parts: LedgerParts) {
    this.folder = parts.folder;
    this.path = parts.path;
    this.mode = parts.mode;
    this.id = parts.id;
    this.version = parts.version;
    this.#reading = new PreparedConnection(parts.reading);
    this.#writing = parts.writing === null ? null : new PreparedConnection(parts.writing);
    this.#lock = parts.lock;
    this.#tools = { ...parts.tools, path: parts.path };
  }

  /**
   * Runs `work` in one `begin immediate` transaction and commits it to the disk; anything thrown rolls all of it
   * back. `work` may run again while somebody else holds the ledger, and awaits nothing but its queries. Hooks given to
   * `afterCommit` run once, after the commit. Throws LedgerError when the ledger cannot be written.
   */
  transact<T>(work: TransactionWork<T>): Promise<T> {
    const writing = this.#writer();
    return this.#writeQueue.run(() =>
      runTransaction(writing, { ...this.#tools, begin: 'begin immediate' }, work),
    );
  }

  /** Runs bounded queries on one consistent state of the ledger; the same rules, no writing, never waits for a writer. */
  read<T>(work: (reader: Reader) => Promise<T>): Promise<T> {
    this.#assertOpen();
    const tools: TransactionTools = { ...this.#tools, begin: 'begin deferred', step: () => {} };
    return this.#readQueue.run(() => runTransaction(this.#reading, tools, work));
  }

  /** Moves the write-ahead log into the ledger file; to be called when idle. Never waits long for a reader. */
  checkpoint(): Promise<CheckpointState> {
    const { connection } = this.#writer();
    return this.#writeQueue.run(() =>
      retryWhileBusy(this.#tools, async () => {
        const [row] = connection.pragma('wal_checkpoint(truncate)') as { busy: number }[];
        return { complete: row?.busy === 0, walBytes: this.walBytes() };
      }),
    );
  }

  /** Gives up to `pages` unused pages back to the disk; returns how many are still unused. */
  vacuumSlice(pages: number): Promise<number> {
    const { connection } = this.#writer();
    return this.#writeQueue.run(() =>
      retryWhileBusy(this.#tools, async () => {
        // To SQLite 0 would mean all of them at once.
        if (pages >= 1) connection.exec(`pragma incremental_vacuum(${Math.trunc(pages)})`);
        return connection.pragma('freelist_count', { simple: true }) as number;
      }),
    );
  }

  /** Size of the write-ahead log, for `status`. */
  walBytes(): number {
    return statSync(`${this.path}-wal`, { throwIfNoEntry: false })?.size ?? 0;
  }

  /** Waits for what was asked for, refuses what comes later, closes, gives the owner's lock back. */
  async close(): Promise<void> {
    if (this.#closed) return;
    this.#closed = true;
    await Promise.all([this.#readQueue.drained(), this.#writeQueue.drained()]);
    this.#reading.connection.close();
    this.#writing?.connection.close();
    this.#lock?.release();
  }

  #assertOpen(): void {
    if (this.#closed) throw new Error('the ledger is closed');
  }

  #writer(): PreparedConnection {
    this.#assertOpen();
    if (this.#writing === null) throw new Error('this ledger was opened for reading only');
    return this.#writing;
  }
}
