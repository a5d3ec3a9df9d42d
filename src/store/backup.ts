import { fork } from 'node:child_process';
import { closeSync, existsSync, fsyncSync, openSync, renameSync, rmSync, statSync } from 'node:fs';
import { dirname, extname } from 'node:path';
import { Worker } from 'node:worker_threads';
import type { CopyAnswer, CopyTask } from './copy-worker.ts';
import { type LedgerRefusal, toRefusal } from './ledger-error.ts';

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
 */
export async function backupLedger(
  path: string,
  file: string,
  step: (name: string) => void = () => {},
): Promise<BackupDone | LedgerRefusal> {
  if (existsSync(file)) return existing(file);
  if (!existsSync(path)) return { refused: 'missing', reason: `there is no ledger ${path} to copy` };
  if (!existsSync(dirname(file))) return noFolder(file);
  const part = `${file}.part`;
  try {
    rmSync(part, { force: true });
    const copied = await inThread({ task: 'copy', path, to: part });
    if ('failed' in copied)
      return refusalOf(copied, /CORRUPT|NOTADB/.test(copied.code) ? path : `copy ${file}`);
    step('backup copied');
    const findings = await quickCheck(part);
    if ('refused' in findings) return findings;
    if (findings.length > 0) {
      return { refused: 'damaged', reason: `the copy of ${path} fails its check: ${findings[0]}` };
    }
    syncFile(part);
    step('backup checked');
    if (existsSync(file)) return existing(file);
    renameSync(part, file);
    syncFile(dirname(file));
    return { file, bytes: statSync(file).size };
  } catch (error) {
    return systemRefusal(error, file);
  } finally {
    rmSync(part, { force: true });
  }
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
