/** SIGHUP to a running service. The signal is emitted inside the process, which runs the command itself. */
import { existsSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { expect, it, onTestFinished } from 'vitest';
import { main } from '../../src/cli/main.ts';
import { makeSite } from '../service/site-on-disk.ts';

/** Resolves when the command has begun to listen to the signal: to what was the case at that moment. */
function listensTo<T>(signal: string, what: () => T): Promise<T> {
  return new Promise((resolve) => {
    const look = (name: string | symbol) => {
      if (name !== signal) return;
      process.off('newListener', look);
      const then = what();
      queueMicrotask(() => resolve(then));
    };
    process.on('newListener', look);
  });
}

it('a reload asked for during the start follows it; one that finds the ledger locked is said, and the service goes on with the site file that it has', async () => {
  const site = makeSite();
  onTestFinished(() => site.remove());
  const lines: string[] = [];
  const heard = new Map<string, () => void>();
  const says = (text: string) => new Promise<void>((resolve) => heard.set(text, resolve));
  const inForce = says('site file in force');
  const problem = says('send SIGHUP again');
  const write = (line: string) => {
    lines.push(line);
    for (const [text, resolve] of heard) if (line.includes(text)) resolve();
  };
  const io = { out: { write }, err: { write }, workingFolder: site.folder };
  const begun = listensTo('SIGHUP', () => existsSync(join(site.data, 'ledger.sqlite')));
  const ended = main(['run'], io as never);
  expect(await begun, 'started before it listens').toBe(false);
  process.emit('SIGHUP');
  await inForce;
  // A transaction lasts no longer than a turn: at the begin of the next one the ledger is free.
  await new Promise((resolve) => setImmediate(resolve));
  const other = new Database(join(site.data, 'ledger.sqlite'));
  other.exec('begin immediate');
  process.emit('SIGHUP');
  await problem;
  other.exec('rollback');
  other.close();
  process.emit('SIGTERM');
  expect(await ended).toBe(0);
  expect(lines.filter((line) => line.includes('is locked by somebody else')).length).toBeGreaterThan(0);
});
