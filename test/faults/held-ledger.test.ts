/** A start on a disk that is really full, and a ledger that another process holds. */
import { execFileSync, spawn } from 'node:child_process';
import { once } from 'node:events';
import { join } from 'node:path';
import { monitorEventLoopDelay } from 'node:perf_hooks';
import { describe, expect, it } from 'vitest';
import { serviceOn, site, trial } from '../service/trial.ts';
import { canMount, leftOutWithoutMount, smallDisk } from './disk-image.ts';

describe.skipIf(!canMount)(`a data folder on a disk that is full${leftOutWithoutMount}`, () => {
  it('at the start: refused in one line, or begun; never half', async () => {
    const disk = smallDisk(300_000);
    const on = site({}, join(disk, 'data'));
    const started = await serviceOn(on).then(
      () => 'started',
      (error: Error) => error.message,
    );
    expect(started).toMatch(/disk is full/);
    execFileSync('mount', ['-o', 'remount,size=60000000', disk]);
    expect(await (await serviceOn(on)).hour(0)).toMatchObject({ taken: 2 });
  });
});

const holder = `
  const Database = require('better-sqlite3');
  const ledger = new Database(process.argv[1]);
  ledger.exec('begin immediate');
  process.stdout.write('held');
  process.stdin.on('data', () => { ledger.exec('rollback'); ledger.close(); process.exit(0); });
`;

describe('a ledger that another process holds for a while', () => {
  it('freezes nothing: mail and intake end their rounds, recordings stay and are taken afterwards', async () => {
    const service = await trial();
    await service.hour(0);
    const other = spawn(process.execPath, ['-e', holder, service.service.ledger.path], {
      cwd: process.cwd(),
    });
    await once(other.stdout, 'data');
    const delay = monitorEventLoopDelay({ resolution: 20 });
    delay.enable();
    const rounds = Promise.all([service.hour(1), service.service.mailRound(), service.service.morning()]);
    expect((await rounds)[0]).toMatchObject({ taken: 0 });
    delay.disable();
    // The driver's own waiting would have stopped the event loop for 5 s and more.
    expect(delay.max / 1e6).toBeLessThan(2_000);
    expect(service.files('drop')).toHaveLength(2);
    other.stdin.write('let go');
    await once(other, 'exit');
    expect(await service.after(6_000)).toMatchObject({ taken: 2 });
  }, 60_000);
});
