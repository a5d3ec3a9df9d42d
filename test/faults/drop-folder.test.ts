/** The drop folder as others use it: gone and back, unwritable, crowded; files kept, deleted, replaced, sent again. */
import { execFileSync, spawnSync } from 'node:child_process';
import {
  mkdirSync,
  mkdtempSync,
  readFileSync,
  renameSync,
  rmSync,
  statSync,
  utimesSync,
  writeFileSync,
} from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { describe, expect, it, onTestFinished } from 'vitest';
import { beginMs, hourMs, makeSite, stamp, TrialService, wav } from '../service/site-on-disk.ts';
import { serviceOn, site, trial } from '../service/trial.ts';
import { crowdIsTaken } from './crowd.ts';

const minuteMs = 60_000;
const pump = (hour: number, more = '') => `pump-2_${stamp(beginMs + hour * hourMs)}${more}.wav`;
const press = (hour: number) => `press-1_${stamp(beginMs + hour * hourMs)}.wav`;

describe('a drop folder', () => {
  it('that vanishes is one trouble of the site, no point is overdue, and all goes on when it is back', async () => {
    const service = await trial();
    await service.hour(0);
    const away = `${service.site.drop}-away`;
    renameSync(service.site.drop, away);
    for (let n = 0; n < 40; n++)
      expect(await service.after(6 * minuteMs)).toMatchObject({ dropFolder: 'missing' });
    expect(await service.standing()).toEqual(['drop-folder site trouble']);
    mkdirSync(service.site.drop);
    service.clock.advance(1000);
    service.drop(pump(4), wav([1]));
    service.drop(press(4), wav([1, 1]));
    expect(await service.take()).toMatchObject({ taken: 2 });
    expect(await service.standing()).toEqual([]);
    rmSync(away, { recursive: true });
  });

  it('whose place is taken by a file is missing, not the end of the service', async () => {
    const service = await trial();
    rmSync(service.site.drop, { recursive: true });
    writeFileSync(service.site.drop, 'no folder');
    expect(await service.after(0)).toMatchObject({ dropFolder: 'missing' });
    rmSync(service.site.drop);
    mkdirSync(service.site.drop);
    expect(await service.hour(0)).toMatchObject({ taken: 2 });
  });

  it('with 400 files at once is taken in, in order, each once', () => crowdIsTaken(400), 60_000);
});

const canFreeze = (() => {
  const probe = mkdtempSync(join(tmpdir(), 'humledger-freeze-'));
  const can = spawnSync('chattr', ['+i', probe]).status === 0;
  spawnSync('chattr', ['-i', probe]);
  rmSync(probe, { recursive: true });
  return can;
})();
const freezes = canFreeze ? '' : ' (left out: chattr +i is not possible here)';

/** A small file system of its own, or null where mounting is not allowed. */
function smallDisk(kilobytes: number): string | null {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-disk-'));
  if (spawnSync('mount', ['-t', 'tmpfs', '-o', `size=${kilobytes}k`, 'tmpfs', folder]).status === 0)
    return folder;
  rmSync(folder, { recursive: true });
  return null;
}
const canMount = (() => {
  const disk = smallDisk(64);
  if (disk !== null) removeDisk(disk);
  return disk !== null;
})();
const mounts = canMount ? '' : ' (left out: mounting is not allowed here)';

function removeDisk(folder: string): void {
  execFileSync('umount', ['-l', folder]);
  rmSync(folder, { recursive: true, force: true });
}

describe('what stands in the way of filing', () => {
  it.skipIf(!canFreeze)(
    `a drop folder that cannot be written: taken once, filed when it can be${freezes}`,
    async () => {
      const service = await trial();
      service.dropHour(0);
      service.drop(press(0).replace('.wav', '.json'), '{"speed_rpm": 2950}');
      service.clock.advance(10_000);
      await service.after(0);
      execFileSync('chattr', ['+i', service.site.drop]);
      try {
        expect(await service.after(6_000)).toMatchObject({ taken: 2, unfiled: 2 });
        for (let n = 0; n < 200; n++) await service.after(10_000);
      } finally {
        execFileSync('chattr', ['-i', service.site.drop]);
      }
      const said = service.said('cannot be filed');
      expect(said.length).toBeGreaterThan(0);
      expect(said.length).toBeLessThan(150);
      await service.after(6_000);
      expect(await service.outcomes()).toEqual({ [press(0)]: 'taken', [pump(0)]: 'taken' });
      expect(service.files('drop')).toEqual([]);
      expect(service.files('data', 'archive')).toHaveLength(3);
    },
  );

  it.skipIf(!canMount)(
    `a data disk that fills up loses nothing: all are taken and filed when there is room${mounts}`,
    async () => {
      const disk = smallDisk(1200) as string;
      onTestFinished(() => removeDisk(disk));
      const filler = join(disk, 'filler');
      const on = makeSite({ recordings: 'overdue_after: 100 h' }, join(disk, 'data'));
      onTestFinished(() => rmSync(on.folder, { recursive: true, force: true }));
      const service = await serviceOn(on);
      await service.hour(0);
      writeFileSync(filler, new Uint8Array(300_000));
      let hour = 1;
      for (; hour < 40 && service.files('drop').length < 6; hour++) await service.hour(hour);
      expect(service.files('drop').length).toBeGreaterThanOrEqual(6);
      rmSync(filler);
      execFileSync('mount', ['-o', 'remount,size=64m', disk]);
      for (let n = 0; n < 4; n++) await service.after(70_000);
      expect(service.files('drop')).toEqual([]);
      expect(await service.rows('recordings', 'count(*) as n', "where outcome = 'taken'")).toEqual([
        { n: 2 * hour },
      ]);
      expect(service.files('data', 'archive')).toHaveLength(2 * hour);
    },
    120_000,
  );
});

describe('after_reading', () => {
  it('keep: files stay, are read once, and again only when they change; also after a restart', async () => {
    const on = site({ folders: 'after_reading: keep' });
    const service = await TrialService.start(on);
    await service.hour(0);
    await service.hour(1);
    expect(service.files('drop')).toEqual([press(0), press(1), pump(0), pump(1)]);
    const { clock } = service;
    await service.stop();
    const again = await serviceOn(on, { clock });
    for (let n = 0; n < 5; n++) expect(await again.after(30_000)).toMatchObject({ taken: 0, waiting: 0 });
    expect(Object.values(await again.outcomes())).toEqual(['taken', 'taken', 'taken', 'taken']);
  });

  it('keep: a logger that writes one name over and over is no logger with a wrong clock', async () => {
    const service = await trial({ folders: 'after_reading: keep', pump: 'recordings:\n  files: latest.wav' });
    for (const hour of [0, 1, 2, 3]) {
      service.toHour(hour);
      service.drop('latest.wav', wav([1], hour + 1));
      const at = new Date(service.clock.wallMs() - 5_000);
      utimesSync(join(service.site.drop, 'latest.wav'), at, at);
      expect(await service.take()).toMatchObject({ taken: 1 });
    }
    expect((await service.standing()).filter((line) => !line.startsWith('overdue press'))).toEqual([]);
    const rows = await service.rows('recordings', 'used_ms, arrived_ms', 'order by id');
    for (const { used_ms, arrived_ms } of rows)
      expect((arrived_ms as number) - (used_ms as number)).toBe(5_000);
  });

  it('delete: files are gone once they are in the ledger; quarantine keeps what could not be read', async () => {
    const service = await trial({ folders: 'after_reading: delete' });
    service.drop(pump(0).replace('.wav', '.json'), '{"speed_rpm": 1480}');
    service.drop(press(1), 'transfer aborted');
    await service.hour(0);
    expect(service.files('drop')).toEqual([]);
    expect(service.files('data', 'archive')).toEqual([]);
    expect(service.files('data', 'quarantine')).toEqual([press(1), `${press(1)}.reason.txt`]);
    expect(await service.rows('levels', 'count(*) as n')).toEqual([{ n: 3 }]);
  });
});

describe('a recording that comes again', () => {
  it('as the same content under the same name or another is a repeat: counted, filed, not evaluated', async () => {
    const service = await trial();
    await service.hour(0);
    const bytes = readFileSync(join(service.site.data, 'archive/2026/03/02', pump(0)));
    service.drop(pump(0), bytes);
    await service.take();
    service.drop(pump(0, '-copy'), bytes);
    await service.take();
    const outcomes = await service.rows(
      'recordings',
      'file_name, outcome, filing_to',
      "where outcome = 'repeat' order by id",
    );
    expect(outcomes).toEqual([
      { file_name: pump(0), outcome: 'repeat', filing_to: `archive/2026/03/02/${pump(0)}` },
      { file_name: pump(0, '-copy'), outcome: 'repeat', filing_to: `archive/2026/03/02/${pump(0, '-copy')}` },
    ]);
    expect(await service.rows('levels', 'count(*) as n')).toEqual([{ n: 3 }]);
    expect(service.files('drop')).toEqual([]);
  });

  it('as other content under the same name is a second version: kept beside the first, not evaluated', async () => {
    const service = await trial();
    await service.hour(0);
    service.drop(pump(0), wav([9], 77));
    await service.take();
    expect(service.files('data', 'archive/2026/03/02').filter((name) => name.startsWith(pump(0)))).toEqual([
      pump(0),
      expect.stringMatching(/\.wav~[0-9a-f]{8}$/),
    ]);
    expect(await service.rows('recordings', 'reason, evaluated', 'where reason is not null')).toEqual([
      { reason: 'a second version of a recording that was whole: kept, not evaluated', evaluated: 0 },
    ]);
  });

  it('as another file before the first has settled counts from its own arrival', async () => {
    const service = await trial();
    service.toHour(0);
    service.drop(pump(0), wav([1], 5));
    await service.after(0);
    writeFileSync(join(service.site.folder, 'next.wav'), wav([1.5], 99));
    renameSync(join(service.site.folder, 'next.wav'), join(service.site.drop, pump(0)));
    expect(await service.after(4_000)).toMatchObject({ taken: 0 });
    expect(await service.after(4_000)).toMatchObject({ taken: 0 });
    expect(await service.after(2_000)).toMatchObject({ taken: 1 });
    expect(await service.rows('recordings', 'arrived_ms')).toEqual([{ arrived_ms: beginMs + 14_000 }]);
  });

  it('in quarantine is tried again when it is dropped again', async () => {
    const service = await trial();
    for (const n of [1, 2]) {
      service.drop(pump(0), 'transfer aborted');
      await service.take();
      expect(await service.rows('recordings', 'count(*) as n')).toEqual([{ n }]);
    }
    expect(service.files('drop')).toEqual([]);
  });

  it('as another file between reading and filing is a new arrival, and the ledger claims no place for the first', async () => {
    const on = site();
    const second = wav([1.5], 99);
    let replaced = false;
    const service: TrialService = await serviceOn(on, {
      step: (name) => {
        if (name !== 'intake: decision committed' || replaced) return;
        replaced = true;
        writeFileSync(join(on.folder, 'next.wav'), second);
        renameSync(join(on.folder, 'next.wav'), join(on.drop, pump(0)));
      },
    });
    service.drop(pump(0), wav([1], 5));
    service.clock.advance(10_000);
    await service.take();
    expect(service.files('drop')).toEqual([pump(0)]);
    expect(await service.rows('recordings', 'filing_to, filing_state')).toEqual([
      { filing_to: null, filing_state: 'filed' },
    ]);
    await service.take();
    expect(readFileSync(join(on.data, 'archive/2026/03/02', pump(0)))).toEqual(Buffer.from(second));
    expect(statSync(join(on.data, 'archive/2026/03/02', pump(0))).size).toBe(second.length);
  });
});
