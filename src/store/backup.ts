import { fork } from 'node:child_process';
import {
  closeSync,
  existsSync,
  fstatSync,
  fsyncSync,
  openSync,
  readdirSync,
  readSync,
  renameSync,
  rmSync,
  statSync,
} from 'node:fs';
import { dirname, extname, join } from 'node:path';
import { Worker } from 'node:worker_threads';
import type { CopyAnswer, CopyTask } from './copy-worker.ts';
import { type LedgerRefusal, toRefusal } from './ledger-error.ts';
import type { BackupStep } from './ledger-steps.ts';

export interface BackupDone {
  readonly file: string;
  readonly bytes: number;
}

/**
 * What SQLite's quick check found, at most twenty lines; empty when the ledger is sound. Takes minutes on a large ledger,
 * and a thread inside SQLite can neither be ended nor left behind by its process: so it runs in a process of its own,
 * which `signal` ends at once (rejects with AbortError).
 */
export async function quickCheck(
  path: string,
  signal?: AbortSignal,
): Promise<readonly string[] | LedgerRefusal> {
  const answer = await inProcess({ task: 'quick-check', path }, signal);
  if ('findings' in answer) return answer.findings;
  // A file that SQLite cannot even read as a database is a finding too.
  if (/^SQLITE_(CORRUPT|NOTADB)/.test(answer.code)) return [answer.failed];
  return refusalOf(answer, path);
}

/**
 * A consistent copy of the ledger while others write: `vacuum into` FILE.part on a read-only connection in a thread, quick
 * check, fsync, rename. Refuses a FILE that is there already. (The driver's stepwise backup starts again with each
 * write beside it and so may never end.)
 *
 * FILE.part of a backup that was killed is cleared by the next one of that name. It is made here and held open, so that
 * of two backups to one name at the same time the one whose part the other took away does not put the other's in place.
 */
export async function backupLedger(
  path: string,
  file: string,
  step: (name: BackupStep) => void = () => {},
): Promise<BackupDone | LedgerRefusal> {
  if (existsSync(file)) return existing(file);
  if (!existsSync(path)) return { refused: 'missing', reason: `there is no ledger ${path} to copy` };
  if (!existsSync(dirname(file))) return noFolder(file);
  const part = `${file}.part`;
  let held: number | null = null;
  try {
    removePart(part);
    held = openSync(part, 'wx');
    step('backup: begun');
    const copied = await inThread({ task: 'copy', path, to: part });
    if (!isSameFile(part, held)) return overtaken(file);
    if ('failed' in copied)
      return refusalOf(copied, /CORRUPT|NOTADB/.test(copied.code) ? path : `copy ${file}`);
    step('backup: copied');
    const findings = await quickCheck(part);
    if ('refused' in findings) return findings;
    if (findings.length > 0) {
      return { refused: 'damaged', reason: `the copy of ${path} fails its check: ${findings[0]}` };
    }
    step('backup: checked');
    syncFile(part);
    step('backup: forced to the disk');
    if (existsSync(file)) return existing(file);
    if (!isSameFile(part, held)) return overtaken(file);
    renameSync(part, file);
    syncFile(dirname(file));
    step('backup: in place');
    return { file, bytes: statSync(file).size };
  } catch (error) {
    return systemRefusal(error, file);
  } finally {
    if (held !== null) {
      if (isSameFile(part, held)) removePart(part);
      closeSync(held);
    }
  }
}

/** A copy that is not finished, with what SQLite may have kept beside it. */
export function removePart(part: string): void {
  for (const path of [part, `${part}-journal`]) rmSync(path, { force: true });
}

/** Names of ledgers' copies in the folder of `file` that are not finished: broken off, or still being made. */
export function unfinishedBeside(file: string): readonly string[] {
  const folder = dirname(file);
  return readdirSync(folder, { withFileTypes: true })
    .filter(
      (entry) => entry.isFile() && entry.name.endsWith('.part') && isCopyBegun(join(folder, entry.name)),
    )
    .map((entry) => entry.name)
    .sort();
}

const sqliteMark = 'SQLite format 3\0';

/** Nothing is in it yet, or a database; false where it is gone by now or cannot be read. */
function isCopyBegun(path: string): boolean {
  let descriptor: number | null = null;
  try {
    descriptor = openSync(path, 'r');
    const start = new Uint8Array(sqliteMark.length);
    const read = readSync(descriptor, start, 0, start.length, 0);
    return read === 0 || Buffer.from(start).toString('latin1') === sqliteMark;
  } catch {
    return false;
  } finally {
    if (descriptor !== null) closeSync(descriptor);
  }
}

function isSameFile(path: string, descriptor: number): boolean {
  const there = statSync(path, { throwIfNoEntry: false });
  const mine = fstatSync(descriptor);
  return there?.ino === mine.ino && there.dev === mine.dev;
}

/** Puts a finished file, or a rename in a folder, on the disk for good. */
export function syncFile(path: string): void {
  const descriptor = openSync(path, 'r');
  try {
    fsyncSync(descriptor);
  } finally {
    closeSync(descriptor);
  }
}

function existing(file: string): LedgerRefusal {
  return {
    refused: 'exists',
    reason: `${file} is there already; a backup never overwrites, name another file`,
  };
}

function overtaken(file: string): LedgerRefusal {
  return {
    refused: 'busy',
    reason: `another backup to ${file} was begun meanwhile; that one goes on, this one is given up`,
  };
}

function refusalOf(answer: { readonly failed: string; readonly code: string }, path: string): LedgerRefusal {
  return toRefusal(Object.assign(new Error(answer.failed), { code: answer.code }), path);
}

/** Errors of the file system around the copy (no right, no room, no folder). */
function systemRefusal(error: unknown, file: string): LedgerRefusal {
  const code = error instanceof Error && 'code' in error ? String(error.code) : '';
  if (code === 'ENOSPC' || code === 'EDQUOT')
    return { refused: 'full', reason: `no room on the disk for ${file}` };
  if (code === 'EACCES' || code === 'EPERM' || code === 'EROFS') {
    return { refused: 'read-only', reason: `no right to write ${file}` };
  }
  if (code === 'ENOENT' || code === 'ENOTDIR') {
    return noFolder(file);
  }
  throw error;
}

function noFolder(file: string): LedgerRefusal {
  return { refused: 'missing', reason: `the folder of ${file} does not exist; make it first` };
}

/** The worker is beside this file and has its ending: .ts run as it stands, .js once built. */
const copyWorker = new URL(`./copy-worker${extname(import.meta.url)}`, import.meta.url);

function inProcess(task: CopyTask, signal?: AbortSignal): Promise<CopyAnswer> {
  const child = fork(copyWorker, [JSON.stringify(task)], {
    execArgv: [],
    stdio: ['ignore', 'ignore', 'ignore', 'ipc'],
    killSignal: 'SIGKILL',
    ...(signal === undefined ? {} : { signal }),
  });
  return new Promise((resolve, reject) => {
    child.once('message', (answer) => resolve(answer as CopyAnswer));
    child.on('error', reject);
    child.once('close', (status, killedBy) =>
      reject(new Error(`the process for ${task.task} ended without an answer (${killedBy ?? status})`)),
    );
  });
}

function inThread(task: CopyTask): Promise<CopyAnswer> {
  const worker = new Worker(copyWorker, { workerData: task });
  return new Promise((resolve, reject) => {
    worker.once('message', resolve);
    worker.once('error', reject);
    worker.once('exit', () => reject(new Error(`the thread for ${task.task} ended without an answer`)));
  });
}
