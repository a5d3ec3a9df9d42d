import { randomUUID } from 'node:crypto';
import { existsSync, mkdirSync, renameSync } from 'node:fs';
import { dirname, join } from 'node:path';
import { setTimeout as pause } from 'node:timers/promises';
import Database, { type Database as Connection } from 'better-sqlite3';
import { removePart, syncFile } from './backup.ts';
import { Ledger, type LedgerMode } from './ledger.ts';
import { LedgerError, type LedgerRefusal, toRefusal } from './ledger-error.ts';
import type { LedgerStep } from './ledger-steps.ts';
import { ledgerVersion, type Migration, migrate, migrations } from './migrations/index.ts';
import { fileSystemType, networkShareName } from './network-share.ts';
import { type OwnerLock, takeOwnerLock } from './owner-lock.ts';
import { setStaleLogAside } from './stale-log.ts';
import { retryWhileBusy } from './transaction.ts';

export interface OpenOptions {
  /** The data folder; made by an owner where it does not exist. */
  readonly folder: string;
  readonly mode: LedgerMode;
  readonly wallMs: () => number;
  readonly monotonicMs: () => number;
  /** Called by name between outside effects; tests throw or kill there. */
  readonly step?: (name: LedgerStep) => void;
  /** How pauses are waited for. */
  readonly wait?: (ms: number) => Promise<void>;
  /** Type of the folder's file system, as statfs(2) gives it. */
  readonly fileSystemType?: (folder: string) => number;
  readonly migrations?: readonly Migration[];
  /** The ledger refuses to grow beyond this many pages of 4 KiB, as if the disk were full. */
  readonly largestPages?: number;
}

/** Time that one try may hold the event loop; longer waits happen between tries (transaction.ts). */
const busyTimeoutMs = 50;
/** At most: a command that looks at years of a point reads pages on which its neighbours' rows lie too. */
const readersCacheKib = 128 * 1024;
/** The log is moved by `checkpoint` when idle; by itself only when it has grown to 64 MiB. */
const automaticCheckpointPages = 16_384;

export function ledgerPath(folder: string): string {
  return join(folder, 'ledger.sqlite');
}

/**
 * Opens the ledger of a data folder, or says why not. An owner takes the owner's lock, creates and migrates (after a
 * copy `ledger-before-N.sqlite`); guests and readers take it as it is, and only in the version they know.
 */
export async function openLedger(options: OpenOptions): Promise<Ledger | LedgerRefusal> {
  const path = ledgerPath(options.folder);
  const opened: { close(): void }[] = [];
  try {
    const answer = await retryWhileBusy(
      { path, wait: options.wait ?? waitMs, monotonicMs: options.monotonicMs },
      async () => {
        closeAll(opened);
        return open(options, path, opened);
      },
    );
    if ('refused' in answer) closeAll(opened);
    return answer;
  } catch (error) {
    closeAll(opened);
    return toRefusal(folderError(error), path);
  }
}

function open(options: OpenOptions, path: string, opened: { close(): void }[]): Ledger | LedgerRefusal {
  const { folder, mode } = options;
  const known = options.migrations ?? migrations;
  if (mode === 'owner') mkdirSync(folder, { recursive: true });
  else if (!existsSync(path)) return missing(folder);
  const share = networkShareName((options.fileSystemType ?? fileSystemType)(folder));
  if (share !== null) return onNetworkShare(folder, share);

  let lock: OwnerLock | null = null;
  if (mode === 'owner') {
    const taken = takeOwnerLock(folder);
    if (taken === null) return owned(folder);
    lock = taken;
    opened.push({ close: () => taken.release() });
    setStaleLogAside(path);
  }
  const writing = mode === 'reader' ? null : openWriting(path, mode, options.largestPages);
  if (writing !== null) opened.unshift(writing);
  const reading = writing === null ? openReading(path) : null;
  reading?.pragma(`cache_size = -${readersCacheKib}`);
  if (reading !== null) opened.unshift(reading);

  const first = writing ?? reading;
  const before = first === null ? null : ledgerVersion(first);
  if (before === null) return foreign(path);
  const refusal = versionRefusal(folder, mode, before, known.length);
  if (refusal !== null) return refusal;
  if (writing !== null && mode === 'owner' && before < known.length)
    bringUpToDate(writing, options, before, known);

  const second = reading ?? openReading(path);
  if (reading === null) opened.unshift(second);
  const id = writing !== null && mode === 'owner' ? nameLedger(writing) : ledgerId(second);
  return new Ledger({
    folder,
    path,
    mode,
    id,
    version: known.length,
    reading: second,
    writing,
    lock,
    tools: {
      wait: options.wait ?? waitMs,
      monotonicMs: options.monotonicMs,
      step: options.step ?? (() => {}),
    },
  });
}

function openWriting(path: string, mode: LedgerMode, largestPages: number | undefined): Connection {
  const connection = new Database(path, { timeout: busyTimeoutMs });
  try {
    // Only takes effect before the first table, and must come before the log mode.
    if (mode === 'owner') connection.pragma('auto_vacuum = incremental');
    const journal = connection.pragma('journal_mode = wal', { simple: true });
    if (journal !== 'wal') {
      throw new LedgerError(
        'other',
        '',
        `this disk cannot hold a ledger: the log mode of ${path} stays ${journal}`,
        null,
      );
    }
    // A ledger that is opened again in WAL falls to NORMAL with this driver, which may lose a commit at a power cut.
    connection.pragma('synchronous = full');
    connection.pragma('foreign_keys = on');
    connection.pragma(`wal_autocheckpoint = ${mode === 'owner' ? automaticCheckpointPages : 0}`);
    if (largestPages !== undefined) connection.pragma(`max_page_count = ${Math.trunc(largestPages)}`);
    return connection;
  } catch (error) {
    connection.close();
    throw error;
  }
}

function openReading(path: string): Connection {
  return new Database(path, { readonly: true, fileMustExist: true, timeout: busyTimeoutMs });
}

/** The copy is named after the first migration to come; one left from an earlier try is replaced. */
function bringUpToDate(
  writing: Connection,
  options: OpenOptions,
  before: number,
  known: readonly Migration[],
): void {
  const step = options.step ?? (() => {});
  if (before > 0) copyOlder(writing, join(options.folder, `ledger-before-${before + 1}.sqlite`), step);
  migrate(writing, known, { wallMs: options.wallMs(), step });
  step('opening: up to date');
}

function copyOlder(writing: Connection, copy: string, step: (name: LedgerStep) => void): void {
  const part = `${copy}.part`;
  removePart(part);
  step('opening: leftovers cleared');
  try {
    writing.prepare('vacuum into ?').run(part);
    step('opening: older ledger copied');
    syncFile(part);
    step('opening: copy forced to the disk');
    renameSync(part, copy);
    syncFile(dirname(copy));
    step('opening: copy in place');
  } finally {
    removePart(part);
  }
}

function nameLedger(writing: Connection): string {
  writing
    .prepare(`insert into meta (key, value) values ('ledger-id', ?) on conflict (key) do nothing`)
    .run(randomUUID());
  return ledgerId(writing);
}

function ledgerId(connection: Connection): string {
  return connection.prepare(`select value from meta where key = 'ledger-id'`).pluck().get() as string;
}

function versionRefusal(
  folder: string,
  mode: LedgerMode,
  found: number,
  known: number,
): LedgerRefusal | null {
  if (found > known) {
    return {
      refused: 'newer',
      reason: `the ledger in ${folder} is of version ${found}, this program knows versions up to ${known}; use the newer program, or restore the backup made before it`,
    };
  }
  if (found < known && mode !== 'owner') {
    return {
      refused: 'older',
      reason: `the ledger in ${folder} is of version ${found}, this program needs version ${known}; start the service once, it copies the ledger and brings it up to date`,
    };
  }
  return null;
}

function owned(folder: string): LedgerRefusal {
  return {
    refused: 'owned',
    reason: `another service already works on the ledger in ${folder}; stop that one first, or name another data folder in the site file`,
  };
}

function missing(folder: string): LedgerRefusal {
  return {
    refused: 'missing',
    reason: `there is no ledger in ${folder} yet; the service makes it when it first starts`,
  };
}

function onNetworkShare(folder: string, share: string): LedgerRefusal {
  return {
    refused: 'network-share',
    reason: `${folder} lies on a network share (${share}), where the ledger's locks cannot be trusted; put the data folder on a local disk`,
  };
}

function foreign(path: string): LedgerRefusal {
  return {
    refused: 'foreign',
    reason: `${path} is another program's database, not a ledger; name another data folder`,
  };
}

/** An unusable folder says so in the same words as an unusable file. */
function folderError(error: unknown): unknown {
  if (!(error instanceof Error) || !('syscall' in error)) return error;
  const code = 'code' in error && error.code === 'ENOSPC' ? 'SQLITE_FULL' : 'SQLITE_CANTOPEN';
  return Object.assign(new Error(error.message, { cause: error }), { code });
}

function closeAll(opened: { close(): void }[]): void {
  for (const part of opened.splice(0)) part.close();
}

async function waitMs(ms: number): Promise<void> {
  await pause(ms);
}
