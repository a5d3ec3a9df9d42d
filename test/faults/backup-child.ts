import { statSync } from 'node:fs';
import { backupLedger } from '../../src/store/backup.ts';

/** Makes a backup as a process of its own, and ends itself the hardest way at a step, or with the copy half written. */
const [ledger = '', file = '', step = ''] = process.argv.slice(2);
const kill = () => process.kill(process.pid, 'SIGKILL');
export const halfCopied = 'half copied';

const done = await backupLedger(ledger, file, (name) => {
  if (name === step) kill();
  // The copy is written by a thread: it goes on while this waits for its first bytes.
  if (name === 'backup: begun' && step === halfCopied)
    setImmediate(() => {
      while (statSync(`${file}.part`).size === 0);
      kill();
    });
});
process.stdout.write(JSON.stringify(done));
