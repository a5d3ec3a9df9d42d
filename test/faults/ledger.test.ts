/** The ledger full, locked, read-only, owned: recordings stay in the drop folder, the service says so and goes on when it can. */
import { execFileSync, spawnSync } from 'node:child_process';
import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { SteppedClock } from '../../src/service/clock.ts';
import { noLog } from '../../src/service/log.ts';
import { Service } from '../../src/service/service.ts';
import { beginMs, TrialService } from '../service/site-on-disk.ts';
import { serviceOn, site, trial } from '../service/trial.ts';

/** Whether a file can be made unchangeable even for root, as on a disk that the system set read-only. */
const canFreeze = (() => {
  const probe = mkdtempSync(join(tmpdir(), 'humledger-freeze-'));
  writeFileSync(join(probe, 'file'), '');
  const can = spawnSync('chattr', ['+i', join(probe, 'file')]).status === 0;
  spawnSync('chattr', ['-i', join(probe, 'file')]);
  rmSync(probe, { recursive: true });
  return can;
})();
const freezes = canFreeze ? '' : ' (left out: chattr +i is not possible here)';

async function frozen<T>(path: string, work: () => Promise<T>): Promise<T> {
  execFileSync('chattr', ['+i', path]);
  try {
    return await work();
  } finally {
    execFileSync('chattr', ['-i', path]);
  }
}

async function pagesOf(service: TrialService): Promise<number> {
  const [row] = await service.rows('pragma_page_count', 'page_count');
  return Number(row?.page_count);
}

describe('a disk that is full', () => {
  it('leaves recordings where they are, is said at most every 30 s, and nothing is lost when there is room', async () => {
    const on = site();
    const first = await TrialService.start(on);
    await first.hour(0);
    const pages = await pagesOf(first);
    const { clock } = first;
    await first.stop();

    const full = await TrialService.start(on, { clock, largestPages: pages + 2 });
    let hour = 1;
    while (full.files('drop').length === 0 && hour < 60) await full.hour(hour++);
    expect(full.files('drop')).not.toEqual([]);
    for (let n = 0; n < 8; n++) await full.after(10_000);
    const said = full.said('the disk is full');
    expect(said.length).toBeGreaterThan(0);
    expect(said.length).toBeLessThanOrEqual(5);
    expect(said.at(-1)).toMatchObject({ times_since: expect.any(Number) });
    await full.stop();

    const roomy = await serviceOn(on, { clock });
    await roomy.take();
    await roomy.after(120_000);
    expect(roomy.files('drop')).toEqual([]);
    expect(await roomy.rows('recordings', 'count(*) as n', "where outcome = 'taken'")).toEqual([
      { n: 2 * hour },
    ]);
    expect(roomy.files('data', 'archive')).toHaveLength(2 * hour);
    expect(await roomy.rows('pragma_integrity_check', '*')).toEqual([{ integrity_check: 'ok' }]);
  }, 60_000);
});

describe('a ledger that somebody else holds', () => {
  it('is waited for: recordings stay, the round ends, and they are taken when it is free', async () => {
    const service = await trial();
    await service.hour(0);
    const other = new Database(join(service.site.data, 'ledger.sqlite'));
    other.exec('begin immediate');
    const round = await service.hour(1);
    expect(round).toMatchObject({ taken: 0, dropFolder: 'read' });
    expect(round.waiting).toBeGreaterThan(0);
    expect(round.againInMs).toBeLessThanOrEqual(30_000);
    expect(service.files('drop')).toHaveLength(2);
    expect(service.said('is locked by somebody else')).not.toEqual([]);
    other.exec('rollback');
    other.close();
    expect(await service.after(6_000)).toMatchObject({ taken: 2 });
    expect(service.files('drop')).toEqual([]);
  }, 60_000);

  it('by a second service: the second refuses to start and says why', async () => {
    const service = await trial();
    const second = await Service.start({
      siteFile: service.site.siteFile,
      clock: new SteppedClock(beginMs),
      log: noLog,
    });
    expect(second).toEqual({ refused: expect.stringMatching(/another service already works on the ledger/) });
    expect(await service.hour(0)).toMatchObject({ taken: 2 });
  });
});

describe('a ledger that cannot be written', () => {
  it("at the start is a refusal in one line, and gives the owner's lock back", async () => {
    const on = site();
    const first = await TrialService.start(on);
    const pages = await pagesOf(first);
    await first.stop();
    const options = { siteFile: on.siteFile, clock: new SteppedClock(beginMs), log: noLog };
    const other = new Database(join(on.data, 'ledger.sqlite'));
    other.exec('begin immediate');
    const refused = await Service.start(options);
    expect(refused).toEqual({ refused: expect.stringMatching(/locked by somebody else/) });
    other.exec('rollback');
    other.close();
    expect(pages).toBeGreaterThan(1);
    const service = await serviceOn(on);
    expect(await service.hour(0)).toMatchObject({ taken: 2 });
  }, 30_000);

  it.skipIf(!canFreeze)(
    `at the start because its file is read-only: refused in one line${freezes}`,
    async () => {
      const on = site();
      await (await TrialService.start(on)).stop();
      const answer = await frozen(join(on.data, 'ledger.sqlite'), () =>
        Service.start({ siteFile: on.siteFile, clock: new SteppedClock(beginMs), log: noLog }),
      );
      expect(answer).toEqual({ refused: expect.stringMatching(/read-only|no right/) });
      expect(await (await serviceOn(on)).hour(0)).toMatchObject({ taken: 2 });
    },
  );

  it.skipIf(!canFreeze)(
    `because its disk turned read-only under it: recordings stay, and are taken afterwards${freezes}`,
    async () => {
      const service = await trial();
      await service.hour(0);
      await frozen(join(service.site.data, 'ledger.sqlite-wal'), async () => {
        expect(await service.hour(1)).toMatchObject({ taken: 0 });
        expect(await service.after(120_000)).toMatchObject({ taken: 0 });
        expect(service.files('drop')).toHaveLength(2);
      });
      expect(service.said('the disk reported an error').length).toBeGreaterThan(0);
      expect(service.said('the disk reported an error').length).toBeLessThanOrEqual(2);
      expect(await service.after(6_000)).toMatchObject({ taken: 2 });
      expect(service.files('drop')).toEqual([]);
    },
  );
});
