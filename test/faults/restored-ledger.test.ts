/**
 * A ledger that was put back from its backup: what it lacks is taken again from the archive in the old order, and what
 * people did meanwhile is named. Real service, real files.
 */
import { createHash } from 'node:crypto';
import {
  copyFileSync,
  existsSync,
  readFileSync,
  renameSync,
  rmSync,
  utimesSync,
  writeFileSync,
} from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { setAsidePath } from '../../src/acquisition/filing-place.ts';
import { actOnAlarm } from '../../src/service/acts-log.ts';
import { SteppedClock } from '../../src/service/clock.ts';
import { backupLedger } from '../../src/store/backup.ts';
import { MailServerOnLoopback } from '../service/mail-server.ts';
import { hourMs, type SiteOnDisk, siteAt, TrialService, wav } from '../service/site-on-disk.ts';
import { serviceOn, site } from '../service/trial.ts';

const sha256 = (bytes: Uint8Array) => createHash('sha256').update(bytes).digest('hex');
const ledgerOf = (on: SiteOnDisk) => join(on.data, 'ledger.sqlite');

/** Everything about recordings and alarms that must be the same again; times of the wall clock and row ids left out. */
async function told(service: TrialService): Promise<unknown> {
  return {
    recordings: await service.rows(
      'recordings',
      'identity, file_name, arrived_ms, used_ms, outcome, evaluated, quality, filing_from, filing_to, filing_state',
      "where outcome in ('taken', 'repeat') order by id",
    ),
    levels: await service.rows('levels', 'point_id, used_ms, level, in_trend', 'order by point_id, used_ms'),
    lives: await service.rows('alarms', 'number, key, severity, raised_used_ms', 'order by number'),
    sources: await service.rows('sources', 'name, clock_offset_ms, newest_used_ms', 'order by name'),
    journal: await service.rows(
      'journal',
      'event, key, number, used_ms',
      "where event not in ('started', 'stopped', 'acknowledged') order by sequence",
    ),
  };
}

async function backup(service: TrialService, on: SiteOnDisk): Promise<string> {
  const file = join(on.folder, 'backup.sqlite');
  expect(await backupLedger(service.service.ledger.path, file)).toMatchObject({ file });
  return file;
}

/** The old log of the ledger is left lying beside it: somebody forgot to remove it. */
function putBack(on: SiteOnDisk, file: string): void {
  copyFileSync(file, ledgerOf(on));
}

/** Three hours, a backup, four hours with an alarm that comes and goes and one that stays. */
async function history(on: SiteOnDisk): Promise<{ service: TrialService; file: string }> {
  const service = await serviceOn(on);
  for (let hour = 0; hour < 3; hour++) await service.hour(hour);
  await service.service.mailRound();
  const file = await backup(service, on);
  await service.hour(3, { press: 5 });
  await service.hour(4, { press: 5, pump: 9 });
  await service.hour(5, { press: 1, pump: 9 });
  await service.hour(6, { press: 1, pump: 9 });
  service.drop('pump-2_again.wav', readFileSync(join(on.data, archived(service, 'pump-2', 6))));
  await service.take();
  return { service, file };
}

function archived(service: TrialService, machine: string, hour: number): string {
  const stamp = new Date(1772431200000 + hour * hourMs).toISOString().slice(0, 13).replace(/[-]/g, '');
  const found = service.files('data', 'archive').find((path) => path.includes(`${machine}_${stamp}`));
  return join('archive', found ?? 'none');
}

describe('a ledger put back from its backup', () => {
  it('takes again from the archive what it lacks: the same recordings, levels, alarms and journal', async () => {
    const on = site();
    const { service, file } = await history(on);
    const before = await told(service);
    const files = service.files('data', 'archive');
    const { clock } = service;
    await service.stop();
    putBack(on, file);
    const again = await serviceOn(on, { clock });
    expect(again.said('the ledger is older than its log')).toMatchObject([{ recordings: 9 }]);
    await again.after(10_000);
    expect(await told(again)).toEqual(before);
    expect(again.files('data', 'archive')).toEqual(files);
    expect(again.files('drop')).toEqual([]);
    expect(await again.hour(7)).toMatchObject({ taken: 2 });
    await again.stop();
    const third = await serviceOn(on, { clock });
    expect(third.said('older than its log')).toEqual([]);
    expect(await third.hour(8)).toMatchObject({ taken: 2 });
  });

  it('also when there is no backup at all: the ledger is made anew from the archive', async () => {
    const on = site();
    const { service } = await history(on);
    const before = await told(service);
    const { clock } = service;
    await service.stop();
    for (const ending of ['', '-wal', '-shm']) rmSync(`${ledgerOf(on)}${ending}`, { force: true });
    const again = await serviceOn(on, { clock });
    await again.after(10_000);
    expect(await told(again)).toEqual(before);
  });

  it('in the hour that comes twice in autumn the same recording is the second one again', async () => {
    const on = site({ recordings: 'clock: site' });
    const text = readFileSync(join(on.folder, 'site.yaml'), 'utf8');
    writeFileSync(join(on.folder, 'site.yaml'), text.replace('<second>Z', '<second>'));
    const local = { ...on, ...siteAt(on.folder) };
    const arrivedMs = Date.UTC(2026, 9, 25, 5);
    const clock = new SteppedClock(arrivedMs);
    const service = await serviceOn(local, { clock });
    // 01:30 in summer time and 01:30 an hour later; whichever hash would come first, it is that of the second.
    const [first, second] = [wav([1], 1), wav([2], 2)].sort((a, b) => sha256(b).localeCompare(sha256(a)));
    for (const [name, bytes, hour] of [
      ['a', first, 0],
      ['b', second, 1],
    ] as const) {
      const file = `pump-2_20261025T013000${name}.wav`;
      service.drop(file, bytes as Uint8Array);
      const changed = new Date(Date.UTC(2026, 9, 25, hour, 30));
      utimesSync(join(on.drop, file), changed, changed);
    }
    await service.take();
    await service.after(20 * 60_000);
    const used = await service.rows('recordings', 'used_ms', 'order by file_name');
    expect(used.map(({ used_ms }) => new Date(used_ms as number).toISOString().slice(11, 16))).toEqual([
      '00:30',
      '01:30',
    ]);
    const before = await told(service);
    await service.stop();
    for (const ending of ['', '-wal', '-shm']) rmSync(`${ledgerOf(on)}${ending}`, { force: true });
    const again = await serviceOn(local, { clock });
    await again.after(10_000);
    expect(await told(again)).toEqual(before);
  });

  it('takes them before anything newer, also when it is killed and the disk is full in between', async () => {
    const on = site();
    const { service, file } = await history(on);
    const before = await told(service);
    const { clock } = service;
    await service.stop();
    putBack(on, file);
    class Broken extends Error {}
    let decisions = 0;
    const dies = await TrialService.start(on, {
      clock,
      step: (name) => {
        if (name === 'intake: decision committed' && ++decisions === 4) throw new Broken();
      },
    });
    await expect(dies.after(10_000)).rejects.toThrow(Broken);
    await dies.stop();
    const again = await serviceOn(on, { clock });
    expect(again.said('older than its log')).toMatchObject([{ recordings: 5 }]);
    await again.after(10_000);
    expect(await told(again)).toEqual(before);
  });

  it('a file that was on its way into the archive gets its name back and is taken as it comes', async () => {
    const on = site();
    const service = await serviceOn(on);
    await service.hour(0);
    const file = await backup(service, on);
    await service.hour(1);
    const { clock } = service;
    const path = archived(service, 'pump-2', 1);
    const [{ from, sha256 }] = (await service.rows(
      'recordings',
      'filing_from as "from", content_sha256 as sha256',
      `where filing_to = '${path}'`,
    )) as { from: string; sha256: string }[];
    await service.stop();
    // As if the ledger had ended between the two renames.
    renameSync(join(on.data, path), join(on.drop, setAsidePath({ from, sha256 })));
    putBack(on, file);
    const again = await serviceOn(on, { clock });
    await again.take();
    expect(again.files('data', 'archive')).toContain(path.slice('archive/'.length));
    expect(again.files('drop')).toEqual([]);
    expect(await again.rows('recordings', 'count(*) as n', "where outcome = 'taken'")).toEqual([{ n: 4 }]);
  });

  it('what was deleted from the archive, or belongs to nobody now, is said and left out', async () => {
    const on = site();
    const { service, file } = await history(on);
    const { clock } = service;
    const gone = archived(service, 'press-1', 4);
    await service.stop();
    rmSync(join(on.data, gone));
    putBack(on, file);
    const again = await serviceOn(on, { clock });
    await again.after(10_000);
    expect(again.said('it lies no longer in the archive')).toHaveLength(1);
    expect(await again.rows('recordings', 'count(*) as n', "where outcome = 'taken'")).toEqual([{ n: 14 }]);
    expect(again.said('taken again from the archive')).toMatchObject([{ taken: 8, left_out: 1 }]);
  });

  it('is told by one mail that names what people did since; nothing of the past is mailed singly', async () => {
    const server = await MailServerOnLoopback.start();
    const on = site({ mailPort: server.port });
    const { service, file } = await history(on);
    await service.service.mailRound();
    const { clock } = service;
    const standing = await service.rows(
      'alarms',
      'number',
      'where ended_wall_ms is null order by number desc',
    );
    const number = Number(standing[0]?.number);
    const person = { by: 'A. Fitter', via: 'command', wallMs: Math.round(clock.wallMs()) } as const;
    const command = { kind: 'acknowledge', comment: 'bearing ordered' } as const;
    expect(await actOnAlarm(service.service.ledger, number, command, person)).toMatchObject({
      after: 'acknowledged',
    });
    await service.stop();
    server.got.length = 0;
    putBack(on, file);
    clock.advance(600_000);
    const again = await serviceOn(on, { clock });
    expect(again.said('an act that the ledger lacks')).toMatchObject([
      { by: 'A. Fitter', command: `acknowledge ${number}` },
    ]);
    await again.service.mailRound();
    await again.after(10_000);
    for (let n = 0; n < 3; n++) {
      clock.advance(300_000);
      await again.service.mailRound();
    }
    const mails = server.to('maintenance@trial.example');
    expect(mails.map(({ subject }) => subject?.replace(/ \d+: .*/, ''))).toEqual([
      'Trial works: service started with an older ledger',
      'DANGER',
      // Its first file without a start of its own stands as a trouble to this day.
      'TROUBLE',
      'Trial works: catch-up: 2 alarms came and went',
    ]);
    expect(mails[0]?.text).toMatch(/acknowledge \d+, by A\. Fitter/);
    expect(mails[0]?.text).toContain('9 recordings of the archive');
    await again.stop();
    const third = await serviceOn(on, { clock });
    expect(third.said('an act that the ledger lacks')).toEqual([]);
  });
});

describe("the log beside a ledger that is not the ledger's own", () => {
  it('is set aside, not read into it', async () => {
    const on = site();
    const service = await serviceOn(on);
    await service.hour(0);
    const file = await backup(service, on);
    for (let hour = 1; hour < 4; hour++) await service.hour(hour);
    copyFileSync(`${ledgerOf(on)}-wal`, join(on.folder, 'old-wal'));
    await service.stop();
    putBack(on, file);
    copyFileSync(join(on.folder, 'old-wal'), `${ledgerOf(on)}-wal`);
    writeFileSync(`${ledgerOf(on)}-shm`, 'left over');
    const again = await serviceOn(on, { clock: new SteppedClock(service.clock.wallMs()) });
    expect(existsSync(`${ledgerOf(on)}-wal.old`)).toBe(true);
    expect(again.said('older than its log')).toMatchObject([{ recordings: 6 }]);
    await again.after(10_000);
    expect(await again.rows('pragma_integrity_check', '*')).toEqual([{ integrity_check: 'ok' }]);
    expect(await again.rows('recordings', 'count(*) as n')).toEqual([{ n: 8 }]);
  });
});
