/** The command check: what a site file means, with real files, a real ledger and a real mail server. */
import { execFile } from 'node:child_process';
import { chmodSync, existsSync, mkdirSync, mkdtempSync, readFileSync, rmSync, writeFileSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { promisify } from 'node:util';
import { simpleParser } from 'mailparser';
import { afterAll, beforeAll, describe, expect, it } from 'vitest';
import { MailServerOnLoopback } from '../service/mail-server.ts';
import { livedInSite, run, type SmallSite, sines, smallSite } from './small-site.ts';

let site: SmallSite;
let original: string;
const folders: string[] = [];

beforeAll(async () => {
  site = await livedInSite();
  original = readFileSync(site.file, 'utf8');
}, 60_000);

afterAll(async () => {
  await site.remove();
  for (const folder of folders) rmSync(folder, { recursive: true });
});

/** The site's file with something changed, beside the original. */
function changed(edit: (text: string) => string, name = 'changed.yaml'): string {
  const path = join(site.folder, name);
  const text = edit(original);
  expect(text).not.toBe(original);
  writeFileSync(path, text);
  return path;
}

const check = (path: string, ...more: string[]) =>
  run(['check', '--site', path, ...more], { clock: site.clock });

interface BandJson {
  readonly band: string;
  readonly level: {
    readonly level: number;
    readonly interval_low: number;
    readonly interval_high: number;
    readonly unit: string;
    readonly detector: string;
  } | null;
  readonly limits: readonly {
    readonly alert: number;
    readonly share_of_alert: number | null;
    readonly share_of_danger: number | null;
  }[];
}

interface PointJson {
  readonly point: string;
  readonly levels_from: string | null;
  readonly remark: string | null;
  readonly can_alarm: boolean;
  readonly files_in_drop: number;
  readonly files_in_archive: number;
  readonly recordings_in_ledger: number;
  readonly newest_in_ledger: string | null;
  readonly averaging: {
    readonly segment_samples: number;
    readonly averages: number;
    readonly effective_averages: number;
    readonly line_spacing_hz: number;
    readonly used_percent: number;
  };
  readonly bands: readonly BandJson[];
}

async function points(path: string): Promise<Map<string, PointJson>> {
  const { out } = await check(path, '--json');
  const { machines } = JSON.parse(out) as { machines: { machine: string; points: PointJson[] }[] };
  return new Map(
    machines.flatMap(({ machine, points: all }) => all.map((point) => [`${machine}/${point.point}`, point])),
  );
}

describe('check', () => {
  it('says per point the files, the level now and its share of each limit', async () => {
    const all = await points(site.file);
    const pump = all.get('pump-2/de-v');
    expect(pump).toMatchObject({
      levels_from: 'ledger',
      files_in_drop: 0,
      files_in_archive: 5,
      recordings_in_ledger: 5,
      can_alarm: true,
    });
    expect(pump?.newest_in_ledger).toBe('2026-03-02T10:00:00.000Z');
    const [band] = pump?.bands ?? [];
    expect(band?.level).toMatchObject({ unit: 'mm/s', detector: 'rms' });
    expect(band?.level?.level).toBeCloseTo(4.4, 1);
    expect(band?.limits[0]?.alert).toBe(2.8);
    expect(band?.limits[0]?.share_of_alert).toBeCloseTo((band?.level?.level ?? 0) / 2.8, 9);
    expect(band?.limits[0]?.share_of_danger).toBeCloseTo((band?.level?.level ?? 0) / 7.1, 9);
    // 2 s at 2560 Hz in segments of 1024, half overlapped.
    expect(pump?.averaging).toMatchObject({
      segment_samples: 1024,
      line_spacing_hz: 2.5,
      averages: 9,
      used_percent: 100,
    });
    expect(pump?.averaging.effective_averages).toBeGreaterThan(7);
    expect(pump?.averaging.effective_averages).toBeLessThan(9);
  });

  it('reads well in a terminal of 80 columns and ends with one line', async () => {
    const { out, status, err } = await check(site.file);
    expect(err).toBe('');
    expect(status).toBe(0);
    for (const line of out.split('\n')) expect(Array.from(line).length).toBeLessThanOrEqual(80);
    expect(out).toMatch(/de-v +overall +4\.\d+ mm\/s +4\.\d+ to 4\.\d+ +15\d % of 2\.8 ! +6\d % of 7\.1/);
    expect(out).toMatch(/visitor\.wav/);
    expect(out.trimEnd().split('\n').at(-1)).toBe(
      '3 points, 3 limits, 0 recipients; no mail: nobody will be told',
    );
  });

  it('keeps to 80 columns with long ids and names', async () => {
    const long = 'drive-end-vertical-of-the-raw-water-pump-in-the-old-hall-2';
    const path = changed((text) =>
      text
        .replace('      - id: de-v\n', `      - id: ${long}\n        formerly: [de-v]\n`)
        .replace('name: Raw water pump 2', `name: ${'Raw water pump of the old intake hall, '.repeat(2)}2`),
    );
    const { out } = await check(path);
    for (const line of out.split('\n').slice(1)) expect(Array.from(line).length).toBeLessThanOrEqual(80);
    expect(out.replace(/\s+/g, '')).toContain('drive-end-');
  });

  it('says ready to run where nothing is missing', async () => {
    const path = changed(
      (text) =>
        `${text}mail:\n  from: a@x.example\n  server:\n    host: 127.0.0.1\n    port: 25\n    security: none\n  to:\n    - address: b@x.example\n`,
    );
    const { out } = await check(path);
    expect(out.trimEnd().split('\n').at(-1)).toBe('3 points, 3 limits, 1 recipient; ready to run');
  });

  it('says of a point without a limit that it can never alarm', async () => {
    const path = changed((text) => text.replace(/ {4}limits:\n(?: {6}.*\n)+/, ''));
    const { out, status } = await check(path);
    expect(out).toContain('de-v: no limit: this point can never alarm');
    expect(out).toContain('de-h, nde-h: no limit: this point can never alarm');
    expect(out.trimEnd().split('\n').at(-1)).toMatch(
      /^3 points, 0 limits, 0 recipients; no limit, no mail: see Missing$/,
    );
    expect(status).toBe(0);
  });

  it('lists what the ledger would retire and which alarms that closes, and changes nothing', async () => {
    const path = changed((text) => text.replace(/ {2}- id: pump-2\n(?: {4}.*\n)+/, ''));
    for (const _ of [1, 2]) {
      const retire = JSON.parse((await check(path, '--json')).out).would_retire as Record<string, unknown>;
      expect(retire).toMatchObject({
        machines: ['pump-2'],
        points: ['pump-2/de-v'],
        bands: ['pump-2/de-v/overall'],
      });
      expect(retire.alarms_closed).toHaveLength(1);
    }
    const { out } = await check(path);
    expect(out).toMatch(
      /would retire, with its series\n {2}- machine pump-2\n {2}- and would close what stands: \d+\n/,
    );
    expect(out).toMatch(/the service runs with an earlier text of this file: send it SIGHUP/);
    expect((await check(site.file)).out).not.toMatch(/earlier text/);
    const standing = await run(['alarms', '--site', site.file, '--json'], { clock: site.clock });
    expect(standing.out).toContain('pump-2');
    expect(JSON.parse((await check(site.file, '--json')).out).would_retire).toMatchObject({
      machines: [],
      alarms_closed: [],
    });
  });

  it('finds the levels of a renamed machine under its former id', async () => {
    const path = changed((text) =>
      text.replace('  - id: pump-2\n', '  - id: pump-7\n    formerly: [pump-2]\n'),
    );
    const all = await points(path);
    expect(all.get('pump-7/de-v')).toMatchObject({ levels_from: 'ledger', recordings_in_ledger: 5 });
    expect(JSON.parse((await check(path, '--json')).out).would_retire.machines).toEqual([]);
  });

  it('measures the newest recording anew where the settings have changed since', async () => {
    const path = changed((text) => text.replace('to: 1000 Hz', 'to: 40 Hz'));
    const pump = (await points(path)).get('pump-2/de-v');
    expect(pump?.levels_from).toBe('file');
    expect(pump?.bands[0]?.level?.level).toBeLessThan(0.2);
  });

  it('tells every problem in one line each, exit status 2', async () => {
    const path = changed((text) =>
      text.replace('alert: 2.8 mm/s', 'alert: 2,8 mm/s').replace('to: 1000 Hz', 'to: 1100 Hz'),
    );
    const { status, out, err } = await check(path);
    expect([status, out]).toEqual([2, '']);
    expect(err.trimEnd().split('\n')).toHaveLength(2);
    for (const line of err.trimEnd().split('\n')) expect(line).toMatch(/changed\.yaml:\d+:\d+: .*; .*/);
    expect((await run(['check', '--as-alarm', 'a/b', '--site', site.file])).status).toBe(2);
  });

  it('is not ready with an open password file or without the drop folder, exit status 1', async () => {
    const mail =
      'mail:\n  from: a@x.example\n  server:\n    host: 127.0.0.1\n    user: u\n    password_file: ./secret\n  to:\n    - address: b@x.example\n';
    const path = changed((text) => `${text.replace('drop: ./drop', 'drop: ./nowhere')}${mail}`);
    const secret = join(site.folder, 'secret');
    const missing = await check(path);
    expect(missing.status).toBe(1);
    expect(missing.out).toMatch(/there is no password file/);
    expect(missing.out).toMatch(/there is no drop folder/);
    writeFileSync(secret, 'x');
    chmodSync(secret, 0o644);
    expect((await check(path)).out).toMatch(/can be read by others/);
    chmodSync(secret, 0o600);
    const closed = await check(path);
    expect(closed.out).not.toMatch(/password file/);
    expect(closed.out.trimEnd().split('\n').at(-1)).toMatch(/^3 points, 3 limits, 1 recipient; /);
    rmSync(secret);
  });

  it('works in a process of its own beside the service', async () => {
    const start = new URL('../../src/cli/start.ts', import.meta.url).pathname;
    const { stdout } = await promisify(execFile)(process.execPath, [
      start,
      'check',
      '--site',
      site.file,
      '--json',
    ]);
    expect(JSON.parse(stdout).counts).toEqual({
      points: 3,
      limits: 3,
      limits_not_reckoned: 0,
      recipients: 0,
    });
  });
});

describe('check without a ledger', () => {
  it('analyses the newest file on the spot, as the service will', async () => {
    const fresh = await smallSite(original);
    try {
      await fresh.service.stop();
      rmSync(join(fresh.folder, 'data'), { recursive: true });
      writeFileSync(join(fresh.folder, 'drop', 'pump-2_20260302T060000Z.wav'), sines([1], 1));
      writeFileSync(join(fresh.folder, 'drop', 'pump-2_20260302T100000Z.wav'), sines([4.4], 4));
      const all = await points(fresh.file);
      expect(existsSync(join(fresh.folder, 'data'))).toBe(false);
      expect(all.get('blower-1/de-h')).toMatchObject({ levels_from: null, remark: 'no recording yet' });
      expect(all.get('pump-2/de-v')).toMatchObject({ levels_from: 'file', files_in_drop: 2 });
      const stored = (await points(site.file)).get('pump-2/de-v');
      expect(all.get('pump-2/de-v')?.bands).toEqual(stored?.bands);
      expect((await check(fresh.file)).out).toMatch(/none yet/);
    } finally {
      rmSync(fresh.folder, { recursive: true });
    }
  });
});

describe('check --mail', () => {
  const withMail = (port: number) => (text: string) =>
    `${text}mail:\n  from: Humledger <h@x.example>\n  server:\n    host: 127.0.0.1\n    port: ${port}\n    security: none\n  to:\n    - address: one@x.example\n    - address: two@x.example\nsummary:\n  to:\n    - address: two@x.example\n    - address: three@x.example\n`;
  const outbox = () =>
    site.service.ledger.read((reader) => reader.selectFrom('messages').selectAll().execute());

  it('sends one test message to each recipient and prints what the server said to each', async () => {
    const server = await MailServerOnLoopback.start();
    const path = changed(withMail(server.port));
    const before = await outbox();
    const { status, out } = await check(path, '--mail');
    expect(status).toBe(0);
    expect(server.got.map(({ recipient }) => recipient).sort()).toEqual([
      'one@x.example',
      'three@x.example',
      'two@x.example',
    ]);
    expect(server.got[0]?.mail.subject).toBe('TEST: Larkfen Waterworks: test message');
    expect(out).toMatch(/^one@x\.example +accepted: 250/m);
    expect(out).toMatch(/3 of 3 accepted/);
    expect(await outbox()).toEqual(before);
  });

  it('fails with exit status 1 when one recipient was refused', async () => {
    const server = await MailServerOnLoopback.start();
    server.atRecipient = (recipient) => (recipient.startsWith('two') ? 550 : undefined);
    const { status, out } = await check(changed(withMail(server.port)), '--mail');
    expect(status).toBe(1);
    expect(out).toMatch(/^two@x\.example +refused: 550/m);
    expect(out).toMatch(/2 of 3 accepted/);
    const json = JSON.parse((await check(changed(withMail(server.port)), '--mail', '--json')).out);
    expect(json.recipients.map(({ accepted }: { accepted: boolean }) => accepted)).toEqual([
      true,
      false,
      true,
    ]);
  });

  it('makes an alarm mail of the newest recording, marked TEST, and stores nothing', async () => {
    const server = await MailServerOnLoopback.start();
    const path = changed(withMail(server.port));
    const before = await outbox();
    const { status } = await check(path, '--mail', '--as-alarm', 'pump-2/de-v');
    expect(status).toBe(0);
    const [got] = server.got;
    expect(got?.mail.subject).toMatch(
      /^TEST: ALERT: Raw water pump 2, drive end vertical, overall 4\.\d+ mm\/s/,
    );
    expect(got?.mail.text).toMatch(/TEST/);
    expect(await outbox()).toEqual(before);
  });

  it('says why there is no such mail, and what to do', async () => {
    const server = await MailServerOnLoopback.start();
    const path = changed((text) =>
      withMail(server.port)(text).replace(/ {2}- id: blower-1\n/, '  - id: blower-9\n'),
    );
    const none = await check(path, '--mail', '--as-alarm', 'blower-9/de-h');
    expect([none.status, none.out]).toEqual([1, '']);
    expect(none.err).toMatch(
      /there is no recording of blower-9\/de-h, neither in the ledger nor in .*drop; let the logger record/,
    );
    const unknown = await check(path, '--mail', '--as-alarm', 'pump-2/de-h');
    expect(unknown).toMatchObject({ status: 2, err: expect.stringMatching(/did you mean 'pump-2\/de-v'/) });
    expect((await check(site.file, '--mail')).err).toMatch(/has no mail: add mail/);
    expect(server.got).toEqual([]);
  });
});

describe('the way of a newcomer', () => {
  it('leads from draft over the marked lines, check and a test alarm to the first run', async () => {
    const folder = mkdtempSync(join(tmpdir(), 'humledger-newcomer-'));
    folders.push(folder);
    mkdirSync(join(folder, 'drop'));
    for (const hour of [6, 7, 8]) {
      const stamp = `20260302T0${hour}0000Z`;
      writeFileSync(join(folder, 'drop', `pump-2_de-v_${stamp}.wav`), sines([3.1], hour));
      writeFileSync(join(folder, 'drop', `blower-1_${stamp}.wav`), sines([1.5, 1.2], hour));
    }
    const at = { workingFolder: folder };
    expect(await run(['draft', './drop'], at)).toMatchObject({ status: 0, err: '' });
    const server = await MailServerOnLoopback.start();
    const file = join(folder, 'site.yaml');
    const draft = readFileSync(file, 'utf8');
    const edited = draft
      .replace(
        /^( *)# (?=( *)(- )?(limits|band|alert|danger|action|respond_within|mail|from|server|host|port|security|to|address|summary|at):)/gm,
        '$1',
      )
      .replace(/^ *sensitivity:.*\n/gm, '')
      .replace(/samples_in:.*/, 'samples_in: m/s2')
      .replace(/expected_every:.*/, 'expected_every: 1 h\n  settle: 0 s')
      .replace('mail.plant.example', '127.0.0.1')
      .replace(/port: 587/, `port: ${server.port}`)
      .replace(/security: starttls.*/, 'security: none')
      .replace(/ +# please confirm.*/g, '');
    writeFileSync(file, edited);

    const checked = await run(['check'], at);
    expect(checked).toMatchObject({ status: 0, err: '' });
    expect(checked.out).toMatch(/de-v +overall +3\.1\d* mm\/s .* 11\d % of 2\.8 !/);
    expect(checked.out).toMatch(/3 points, 3 limits, 1 recipient; ready to run\n$/);

    const tried = await run(['check', '--mail', '--as-alarm', 'pump-2/de-v'], at);
    expect(tried).toMatchObject({ status: 0, err: '' });
    const test = await simpleParser(server.got[0]?.raw ?? '');
    expect(test.subject).toMatch(/^TEST: ALERT: pump-2, drive end, vertical, overall 3\.1/);

    const ran = await run(['run', '--once'], at);
    expect(ran.status).toBe(0);
    expect(ran.out).toMatch(
      /6 recordings taken, 0 files set aside, 0 left in the drop folder, 0 mails waiting/,
    );
    const subjects = server.got.map(({ mail }) => mail.subject ?? '');
    expect(subjects.some((subject) => /^ALERT 1: pump-2, drive end, vertical, overall/.test(subject))).toBe(
      true,
    );
    const after = await run(['check'], at);
    expect(after.out).toMatch(/de-v +0 +3 +3 +2026-03-02 08:00\n/);

    const again = await run(['check', '--mail', '--as-alarm', 'pump-2/de-v'], at);
    expect(again).toMatchObject({ status: 0, err: '' });
    const pictured = await simpleParser(server.got.at(-1)?.raw ?? '');
    expect(pictured.attachments.map(({ filename }) => filename)).toEqual(['trend-1.png', 'spectrum-1.png']);
  }, 30_000);
});
