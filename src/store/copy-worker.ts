import { parentPort, workerData } from 'node:worker_threads';
import Database from 'better-sqlite3';
import { codeOf } from './ledger-error.ts';

/** Slow work on a ledger, off the service's thread and on a connection of its own: in a thread, or a process. */
export type CopyTask =
  | { readonly task: 'quick-check'; readonly path: string }
  | { readonly task: 'copy'; readonly path: string; readonly to: string };

/** `findings`: what quick_check said, empty when sound. */
export type CopyAnswer =
  | { readonly findings: readonly string[] }
  | { readonly failed: string; readonly code: string };

const findingsAtMost = 20;

function perform(task: CopyTask): readonly string[] {
  const connection = new Database(task.path, { readonly: true, fileMustExist: true, timeout: 1000 });
  try {
    if (task.task === 'copy') {
      connection.prepare('vacuum into ?').run(task.to);
      return [];
    }
    const rows = connection.pragma(`quick_check(${findingsAtMost})`) as { quick_check: string }[];
    return rows.map((row) => row.quick_check).filter((line) => line !== 'ok');
  } finally {
    connection.close();
  }
}

function answer(task: CopyTask): CopyAnswer {
  try {
    return { findings: perform(task) };
  } catch (error) {
    return { failed: error instanceof Error ? error.message : String(error), code: codeOf(error) };
  }
}

if (parentPort !== null) parentPort.postMessage(answer(workerData as CopyTask));
else process.send?.(answer(JSON.parse(process.argv[2] ?? '')), () => process.disconnect());
