/** A check of the ledger that takes long, as on a large one. */
import { execFileSync } from 'node:child_process';
import { join } from 'node:path';
import { expect, it, vi } from 'vitest';
import { serviceOn, site } from './trial.ts';

const { pipe } = vi.hoisted(() => ({ pipe: { path: '' } }));

// SQLite's call does not return on a pipe that nobody writes to, as it does not for minutes on a large ledger.
vi.mock('../../src/store/backup.ts', async (original) => {
  const real = await original<typeof import('../../src/store/backup.ts')>();
  return { ...real, quickCheck: (_: string, signal?: AbortSignal) => real.quickCheck(pipe.path, signal) };
});

it('a check under way does not hold up the stop, which is a clean one', async () => {
  const on = site();
  pipe.path = join(on.folder, 'pipe');
  execFileSync('mkfifo', [pipe.path]);
  const service = await serviceOn(on);
  await service.after(0);
  await service.after(25 * 3_600_000);
  await service.stop();
  expect(service.said('could not be checked')).toEqual([]);
  const next = await serviceOn(on);
  const started = await next.rows(
    'journal',
    'reason',
    "where event = 'started' order by sequence desc limit 1",
  );
  expect(started).toEqual([{ reason: '{"after":"ended"}' }]);
}, 20_000);
