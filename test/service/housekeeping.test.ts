/** What becomes of the service when the thread that checks its ledger fails. */
import { expect, it, vi } from 'vitest';
import { serviceOn, site } from './trial.ts';

// No file makes a thread fail to start, so the failure is put in its place; all else is real.
vi.mock('../../src/store/backup.ts', async (original) => ({
  ...(await original<typeof import('../../src/store/backup.ts')>()),
  quickCheck: () => Promise.reject(new Error('no thread to be had')),
}));

it('a check of the ledger that cannot be made is said, and neither ends the service nor hinders its stop', async () => {
  const service = await serviceOn(site());
  await service.after(0);
  await service.after(25 * 3_600_000);
  await service.stop();
  const said = service.log.filter(({ msg }) => msg === 'the ledger could not be checked');
  expect(said.map(({ error }) => error)).toEqual(['Error: no thread to be had']);
});
