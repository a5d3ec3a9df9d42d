import { existsSync } from 'node:fs';
import { join } from 'node:path';
import Database, { type Database as Connection } from 'better-sqlite3';
import { isBusy } from './ledger-error.ts';

/**
 * One owner a ledger. The lock is SQLite's exclusive lock on a file of its own: the kernel gives it back however the
 * process ends, so there is no stale lock file to clear. Never open `owner.lock` by other means inside the service:
 * closing any descriptor of it would give the process's lock away (POSIX record locks).
 */
export interface OwnerLock {
  release(): void;
}

/** Keeps the connections alive: one that nobody refers to any more is closed by the garbage collector, lock and all. */
const held = new Set<Connection>();

/** A probe by `isOwned` holds the file for less than a millisecond; the owner outwaits it. */
const outwaitProbesMs = 50;

function lockFile(folder: string): string {
  return join(folder, 'owner.lock');
}

/** Null when another process (or this one) owns the ledger already. Errors of the disk are thrown as they come. */
export function takeOwnerLock(folder: string): OwnerLock | null {
  const connection = new Database(lockFile(folder), { timeout: outwaitProbesMs });
  try {
    connection.exec('begin exclusive');
  } catch (error) {
    connection.close();
    if (isBusy(error)) return null;
    throw error;
  }
  held.add(connection);
  return {
    release: () => {
      held.delete(connection);
      connection.close();
    },
  };
}

/** Whether a service works on the ledger of this folder now. */
export function isOwned(folder: string): boolean {
  if (!existsSync(lockFile(folder))) return false;
  const connection = new Database(lockFile(folder), { readonly: true, fileMustExist: true, timeout: 0 });
  try {
    connection.prepare('select count(*) from sqlite_master').get();
    return false;
  } catch (error) {
    if (isBusy(error)) return true;
    throw error;
  } finally {
    connection.close();
  }
}
