import { mkdtempSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { expect, test } from 'vitest';
import { livedInSite, run, siteText, smallSite } from './small-site.ts';

test('says since when the service runs, what came last, what waits; and that it is stuck, and that it is gone', async () => {
  const site = await livedInSite();
  try {
    const status = (...more: string[]) =>
      run(['status', '--site', site.file, ...more], { clock: site.clock });
    const running = await status();
    expect(running).toMatchObject({ status: 0, err: '' });
    expect(running.out).toMatch(
      /^service +running since 2026-03-02 06:00, 4 hours 41 minutes ago\s+\(process\s+\d+\)$/m,
    );
    expect(running.out).toMatch(/^newest recording +pump-2_20260302T100000Z\.wav, of 2026-03-02 10:00/m);
    expect(running.out).toMatch(/^overdue +no point$/m);
    expect(running.out).toMatch(/^standing +danger 0, alert 1, trouble \d; see humledger alarms$/m);
    expect(running.out).toMatch(/^unassigned +visitor\.wav; see humledger files$/m);
    const answer = JSON.parse((await status('--json')).out);
    expect(answer).toMatchObject({
      running: true,
      stuck: false,
      running_since: '2026-03-02T06:00:00.000Z',
      site_file_in_force: true,
      newest_recording: { file: 'pump-2_20260302T100000Z.wav', start: '2026-03-02T10:00:00.000Z' },
      drop_folder: 'read',
      unassigned: ['visitor.wav'],
      mails_waiting: 0,
      last_summary: null,
    });
    expect(answer.wal_bytes).toBeGreaterThanOrEqual(0);

    writeFileSync(site.file, `${siteText}# another text\n`);
    expect(JSON.parse((await status('--json')).out).site_file_in_force).toBe(false);

    // A pause of the usual two minutes between sweeps is no sign of being stuck.
    site.clock.advance(200_000);
    expect(await status()).toMatchObject({ status: 0 });
    site.clock.advance(60_000);
    const stuck = await status();
    expect(stuck.status).toBe(1);
    expect(stuck.out).toMatch(/^service +stuck \(process \d+\): runs since/m);

    site.clock.advance(4 * 3_600_000);
    await site.rounds(0);
    const overdue = JSON.parse((await status('--json')).out).overdue as { machine: string; point: string }[];
    expect(overdue.map(({ machine, point }) => `${machine}/${point}`).sort()).toEqual([
      ...['blower-1/de-h', 'blower-1/nde-h', 'pump-2/de-v'],
    ]);
    expect((await status()).out).toMatch(/^overdue +\S+, number \d+: last arrival 2026-03-02 10:00/m);

    await site.service.stop();
    const gone = await status();
    expect(gone.status).toBe(1);
    expect(gone.out).toMatch(/^service +does not run; last round 2026-03-02/m);
    expect(JSON.parse((await status('--json')).out)).toMatchObject({
      running: false,
      pid: null,
      running_since: null,
    });
  } finally {
    rmSync(site.folder, { recursive: true });
  }
}, 60_000);

test('a service that has just begun is not stuck, whatever the file of its last run says', async () => {
  const site = await smallSite();
  try {
    const ran = await run(['status', '--site', site.file], { clock: site.clock });
    expect(ran.status).toBe(0);
    expect(ran.out).toMatch(/^service +running since 2026-03-02 06:00, no time ago$/m);
    expect(ran.out).toMatch(/^newest recording +none yet$/m);
  } finally {
    await site.remove();
  }
});

test('where no service ever ran it says so, exit status 1', async () => {
  const folder = mkdtempSync(join(tmpdir(), 'humledger-status-'));
  writeFileSync(join(folder, 'site.yaml'), siteText);
  const ran = await run(['status'], { workingFolder: folder });
  expect(ran).toMatchObject({ status: 1, out: '' });
  expect(ran.err).toContain('there is no ledger in');
  rmSync(folder, { recursive: true });
});
