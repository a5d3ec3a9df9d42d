import { spawnSync } from 'node:child_process';
import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, expect, it } from 'vitest';
import { livedInSite, run, type SmallSite } from './small-site.ts';

let site: SmallSite;

beforeAll(async () => {
  site = await livedInSite();
}, 60_000);
afterAll(() => site.remove());

/** A copy of the site file beside it, with one text in place of another. */
function candidate(from: string, to: string): string {
  const file = join(site.folder, 'site-new.yaml');
  const text = readFileSync(site.file, 'utf8');
  if (!text.includes(from)) throw new Error(`no ${from} in the site file`);
  writeFileSync(file, text.replace(from, to));
  return file;
}

const rehearse = (file: string, ...more: string[]) =>
  run(['rehearse', '--site', file, '--days', '7', ...more], { clock: site.clock });

it('says that the file in force would have given what came', async () => {
  const { status, out, err } = await rehearse(site.file);
  expect({ status, err }).toEqual({ status: 0, err: '' });
  expect(out).toBe(`1 day (2026-03-02 to 2026-03-02), 3 limits of 3 points: 1 alarm would have come,
1 came.

limit                            alarms  came  in alarm  longest  last
pump-2/de-v overall-fixed-upper       1     1    60 min   60 min  2026-03-02
  still stands
2 limits would not have given an alarm.

Budget 5 a week a person: nobody gets mail by this file.
`);
});

it('tries another limit, with each alarm of a machine and what it would need', async () => {
  const file = candidate('alert: 2.8 mm/s', 'alert: 2.1 mm/s');
  const { status, out } = await rehearse(file, '--machine', 'pump-2', '--wanted', '0.1 a day');
  expect(status).toBe(0);
  expect(out).toContain('pump-2/de-v overall-fixed-upper       1     1');
  expect(out).toMatch(/2026-03-02 08:00 {2}alert +stands {2}would come +de-v overall-fixed-upper\n/);
  expect(out).toMatch(/2026-03-02 09:00 {2}alert +stands {2}came, would not {2}de-v/);
  expect(out).toMatch(
    /for 0\.1 a day .*\npump-2\/de-v overall-fixed-upper {2}alert {2}2\.1 mm\/s +1 +4\.\d+ mm\/s +0\n/,
  );
  expect(Math.max(...out.split('\n').map((line) => line.length))).toBeLessThanOrEqual(80);
});

it('names what has to be analysed anew, and what came of limits that are not rehearsed', async () => {
  const file = candidate('to: 1000 Hz', 'to: 900 Hz');
  const { out } = await rehearse(file);
  expect(out).toContain('0 limits of 0 points');
  expect(out.replaceAll('\n', ' ')).toContain(
    'Cannot be rehearsed, its edges or its quantity are others: blower-1/de-h overall, blower-1/nde-h overall, pump-2/de-v overall.',
  );
  expect(out).toContain('pump-2/de-v/overall/overall-fixed-upper');
});

it('gives everything as JSON', async () => {
  const { out } = await rehearse(site.file, '--json', '--wanted', '1 a month');
  const answer = JSON.parse(out);
  expect(answer.alarm_budget).toEqual({ a_week: 5 });
  const pump = answer.limits.find(({ machine }: { machine: string }) => machine === 'pump-2');
  expect(pump).toMatchObject({
    alarms: 1,
    in_alarm_s: 3600.001,
    compared: 5,
    wanted: { moves: 'alert', unit: 'mm/s', now: 2.8 },
  });
  expect(pump.would_have_come).toMatchObject([
    { raised: '2026-03-02T09:00:00.000Z', returned: null, severity: 'alert' },
  ]);
  expect(pump.came).toEqual([
    { raised: '2026-03-02T09:00:00.000Z', returned: null, severity: 'alert', chattering: false },
  ]);
});

it('refuses what makes no sense, and says when there is nothing to look at', async () => {
  expect(await rehearse(site.file, '--days', '0')).toMatchObject({ status: 2 });
  expect(await rehearse(site.file, '--wanted', 'seldom')).toMatchObject({ status: 2 });
  expect(await rehearse(site.file, '--machine', 'pump-3')).toMatchObject({ status: 1 });
  expect((await rehearse(site.file, '--machine', 'pump-2/de-v')).err).toContain('takes a machine');
  const later = { ...site.clock, wallMs: () => site.clock.wallMs() + 30 * 86_400_000 };
  expect(
    await run(['rehearse', '--site', site.file, '--days', '7'], { clock: later as SmallSite['clock'] }),
  ).toMatchObject({
    status: 1,
    err: 'the ledger has no levels of the last 7 days\n',
  });
});

it('runs as a program of its own beside the service', () => {
  const entry = join(import.meta.dirname, '../../src/cli/start.ts');
  const args = [entry, 'rehearse', '--site', site.file, '--days', '3660'];
  const { status, stdout } = spawnSync(process.execPath, args, { encoding: 'utf8' });
  expect(status).toBe(0);
  expect(stdout).toContain('1 alarm would have come');
});
