import { closeSync, existsSync, openSync, readSync, renameSync, rmSync } from 'node:fs';

/** Where SQLite's header says how the file is written: 1 by a rollback journal, 2 by a write-ahead log. */
const versionAt = 18;

/**
 * A backup that was put in the ledger's place while the old ledger's write-ahead log still lies beside it: SQLite would
 * read that log into the backup, pages of another file. A backup is not written by such a log, so a log beside it is none of
 * its own and is set aside under `ledger.sqlite-wal.old`. To be called by the owner, before anything is opened.
 */
export function setStaleLogAside(path: string): boolean {
  if (!existsSync(path) || !existsSync(`${path}-wal`)) return false;
  const version = new Uint8Array(1);
  const descriptor = openSync(path, 'r');
  try {
    if (readSync(descriptor, version, 0, 1, versionAt) !== 1 || version[0] !== 1) return false;
  } finally {
    closeSync(descriptor);
  }
  renameSync(`${path}-wal`, `${path}-wal.old`);
  rmSync(`${path}-shm`, { force: true });
  return true;
}
