/**
 * The power fails between any two steps: what was forced to the disk is all that is left. A real file system in a file,
 * whose image is copied at every step while the service runs: the copy holds what a cut at that moment would leave.
 */
import { createHash } from 'node:crypto';
import { closeSync, fsyncSync, openSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { describe, expect, it } from 'vitest';
import { SteppedClock } from '../../src/service/clock.ts';
import type { StepName } from '../../src/service/steps.ts';
import { filesBelow, makeSite, siteAt, TrialService } from '../service/site-on-disk.ts';
import { canMount, diskImage, leftOutWithoutMount } from './disk-image.ts';

/** As it stands in the ledger at one moment. */
interface Committed {
  readonly rows: Readonly<Record<string, readonly unknown[]>>;
  readonly filed: readonly { readonly filing_to: string; readonly content_sha256: string }[];
}

const queries = {
  recordings: 'select id, identity, outcome, filing_state from recordings order by id',
  levels: 'select count(*) as n from levels',
  journal: 'select sequence, event, key from journal order by sequence',
  states: 'select key, state from alarm_states order by key',
  told: 'select id, identity, message_id from to_tell order by id',
  deliveries: 'select mail_id, state from deliveries order by mail_id',
};

/** What a cut leaves is opened as the service opens it, which rolls back what was half written. */
function committedIn(data: string, readonly: boolean): Committed {
  const ledger = new Database(join(data, 'ledger.sqlite'), { readonly });
  try {
    expect(ledger.pragma('quick_check', { simple: true })).toBe('ok');
    // While the ledger is made, all of its tables are there or none.
    const tables = ledger.prepare("select count(*) from sqlite_master where type = 'table'").pluck().get();
    if (tables === 0) return { rows: {}, filed: [] };
    return {
      rows: Object.fromEntries(
        Object.entries(queries).map(([name, query]) => [name, ledger.prepare(query).all()]),
      ),
      filed: ledger
        .prepare("select filing_to, content_sha256 from recordings where filing_state = 'filed' order by id")
        .all() as Committed['filed'],
    };
  } finally {
    ledger.close();
  }
}

/** The site on a disk of its own; its logger has forced its files to the disk, or leaves that to the system. */
function siteOn(folder: string) {
  const before = process.env.TMPDIR;
  process.env.TMPDIR = folder;
  try {
    return makeSite();
  } finally {
    if (before === undefined) delete process.env.TMPDIR;
    else process.env.TMPDIR = before;
  }
}

function force(path: string): void {
  const descriptor = openSync(path, 'r');
  fsyncSync(descriptor);
  closeSync(descriptor);
}

const sha256 = (bytes: Uint8Array) => createHash('sha256').update(bytes).digest('hex');

describe.skipIf(!canMount)(`a power cut${leftOutWithoutMount}`, () => {
  it('at any step leaves every committed decision, every filed recording whole, and none lost', async () => {
    const disk = diskImage();
    const on = siteOn(disk.folder);
    const below = (folder: string) => join(folder, on.folder.slice(disk.folder.length));
    const seen = new Map<StepName, number>();
    const dropped: string[] = [];
    let cuts = 0;
    const service = await TrialService.start(on, {
      step: (name) => {
        const times = (seen.get(name) ?? 0) + 1;
        seen.set(name, times);
        if (times > 4) return;
        const now = committedIn(on.data, true);
        const after = disk.cut();
        try {
          const data = join(below(after.folder), 'data');
          const left = committedIn(data, false);
          expect(left.rows, name).toEqual(now.rows);
          for (const { filing_to, content_sha256 } of left.filed)
            expect(sha256(readFileSync(join(data, filing_to))), `${name}: ${filing_to}`).toBe(content_sha256);
          const anywhere = [...filesBelow(below(join(after.folder)))];
          const hashes = new Set(
            anywhere.map((path) => sha256(readFileSync(join(below(after.folder), path)))),
          );
          for (const hash of dropped) expect(hashes, name).toContain(hash);
          cuts++;
        } finally {
          after.letGo();
        }
      },
    });
    for (let hour = 0; hour < 3; hour++) {
      service.toHour(hour);
      service.dropHour(hour, { press: hour === 0 ? 1 : 5 });
      for (const path of service.files('drop')) {
        dropped.push(sha256(readFileSync(join(on.drop, path))));
        force(join(on.drop, path));
      }
      force(on.drop);
      await service.take();
    }
    await service.stop();
    expect(seen.get('intake: filing committed')).toBeGreaterThan(2);
    expect(cuts).toBeGreaterThan(25);
  }, 120_000);

  it('after a recording was filed leaves it whole, also where its logger forced nothing to the disk', async () => {
    const disk = diskImage();
    const on = siteOn(disk.folder);
    let left: { readonly committed: Committed; readonly whole: boolean[] } | null = null;
    const service = await TrialService.start(on, {
      step: (name) => {
        if (name !== 'intake: filing committed') return;
        const after = disk.cut();
        const data = join(after.folder, on.folder.slice(disk.folder.length), 'data');
        const committed = committedIn(data, false);
        const whole = committed.filed.map(
          ({ filing_to, content_sha256 }) => sha256(readFileSync(join(data, filing_to))) === content_sha256,
        );
        left = { committed, whole };
        after.letGo();
      },
    });
    await service.hour(0);
    await service.stop();
    expect(left).toMatchObject({ whole: [true, true] });
  });

  it('is gone on from: the service that starts on what is left ends where it would have ended', async () => {
    const disk = diskImage();
    const on = siteOn(disk.folder);
    force(join(on.folder, 'site.yaml'));
    let reached = 0;
    const later: { folder: string; letGo(): void; recordings: number }[] = [];
    const service = await TrialService.start(on, {
      step: (name) => {
        if (/^filing: |filing noted|decision committed/.test(name) && ++reached % 3 === 0 && later.length < 4)
          later.push({ ...disk.cut(), recordings: reached });
      },
    });
    for (let hour = 0; hour < 2; hour++) {
      service.toHour(hour);
      service.dropHour(hour);
      for (const path of service.files('drop')) force(join(on.drop, path));
      force(on.drop);
      await service.take();
    }
    const { clock } = service;
    await service.stop();
    expect(later.length).toBe(4);
    for (const { folder, letGo } of later) {
      const left = siteAt(join(folder, on.folder.slice(disk.folder.length)));
      const again = await TrialService.start(left, { clock: new SteppedClock(clock.wallMs()) });
      await again.take();
      await again.after(120_000);
      const filed = await again.rows('recordings', 'filing_state, outcome, filing_to', 'order by id');
      expect(again.files('drop')).toEqual([]);
      expect(filed.every(({ filing_state }) => filing_state === 'filed')).toBe(true);
      expect(filed.every(({ outcome }) => outcome === 'taken')).toBe(true);
      expect(again.files('data', 'archive')).toHaveLength(filed.length);
      await again.stop();
      letGo();
    }
  }, 60_000);
});
