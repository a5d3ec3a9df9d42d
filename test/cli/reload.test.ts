/** SIGHUP to a running service. The signal is emitted inside the process, which runs the command itself. */
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { expect, it, onTestFinished } from 'vitest';
import { main } from '../../src/cli/main.ts';
import { makeSite } from '../service/site-on-disk.ts';

/** Resolves when the command has begun to listen to the signal. */
function listensTo(signal: string): Promise<void> {
  return new Promise((resolve) => {
    const look = (name: string | symbol) => {
      if (name !== signal) return;
      process.off('newListener', look);
      setImmediate(resolve);
    };
    process.on('newListener', look);
  });
}

it('a reload that finds the ledger locked is said, and the service goes on with the site file that it has', async () => {
  const site = makeSite();
  onTestFinished(() => site.remove());
  const lines: string[] = [];
  let said = () => {};
  const problem = new Promise<void>((resolve) => {
    said = resolve;
  });
  const write = (line: string) => {
    lines.push(line);
    if (line.includes('send SIGHUP again')) said();
  };
  const io = { out: { write }, err: { write }, workingFolder: site.folder };
  const begun = listensTo('SIGHUP');
  const ended = main(['run'], io as never);
  await begun;
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
