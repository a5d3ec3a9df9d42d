import { existsSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { run, type SmallSite, smallSite } from './small-site.ts';

let site: SmallSite;
beforeAll(async () => {
  site = await smallSite();
  // pump-2 is over its alert limit from the fourth hour on: two recordings in a row.
  for (const hour of [0, 1, 2, 3]) await site.hour(hour);
}, 60_000);
afterAll(() => site.remove());

const alarms = (...args: string[]) => run(['alarms', ...args, '--site', site.file], { clock: site.clock });
const all = async () => JSON.parse((await alarms('--json')).out) as Record<string, unknown>[];
const status = async () => (await run(['status', '--site', site.file], { clock: site.clock })).out;
const events = async () =>
  (JSON.parse((await alarms('--journal', '--json', '--limit', '500')).out) as Record<string, unknown>[]).map(
    ({ event }) => event,
  );
const by = ['--by', 'A. Fitter', '--comment', 'tank cleaning beside it'];

describe('a shelf', () => {
  test('holds an alarm back until its time, and says so wherever alarms are shown', async () => {
    expect(await alarms('shelve', '1', '--for', '8h', ...by)).toEqual({
      status: 0,
      out: 'number 1, pump-2/de-v overall: unacknowledged, now shelved until 2026-03-02 17:00\n',
      err: '',
    });
    const [one] = await all();
    expect(one).toMatchObject({
      number: 1,
      condition: 'alert',
      standing: 'shelved',
      suppressions: ['shelved'],
      suppressed_until: '2026-03-02T17:00:22.000Z',
      suppressed_by: 'A. Fitter',
      suppressed_why: 'tank cleaning beside it',
    });
    const { out } = await alarms();
    expect(out).toContain('held back until 2026-03-02 17:00 by A. Fitter: tank cleaning beside it');
    expect(Math.max(...out.split('\n').map((line) => line.length))).toBeLessThanOrEqual(80);
    expect(await status()).toMatch(/standing +danger 0, alert 1, trouble 0; held back 1 shelved/);
    const { out: summary } = await run(['summary', '--text', '--site', site.file], { clock: site.clock });
    expect(summary.replace(/\s+/g, ' ')).toContain(
      'shelved until Mon 2 Mar 2026, 17:00, by A. Fitter: tank cleaning beside it',
    );
    expect(readFileSync(join(site.folder, 'data', 'acts.log'), 'utf8')).toContain('"command":"shelve 1"');
  });

  test('is never longer than the site allows, and needs a reason', async () => {
    expect(await alarms('shelve', '1', '--for', '8 d', ...by)).toEqual({
      status: 1,
      out: '',
      err: 'an alarm can be shelved for at most 7 d (shelve_at_most)\n',
    });
    expect((await alarms('shelve', '1', '--for', '8 h', '--by', 'K')).status).toBe(2);
    expect((await alarms('shelve', '1', ...by)).status).toBe(2);
    for (const [time, err] of [
      ['soon', "--for: 'soon' does not begin with a number; write: --for '8 h'\n"],
      ['3', "--for: '3' has no unit; write: --for '3 h'\n"],
    ] as const)
      expect(await alarms('shelve', '1', '--for', time, ...by)).toEqual({ status: 2, out: '', err });
    expect((await alarms('unshelve', '77', ...by)).err).toBe('there is no alarm or trouble number 77\n');
  });

  test('ends by itself at its time, while no recording comes; what stands is told', async () => {
    await site.rounds(7 * 3_600_000);
    expect((await all())[0]).toMatchObject({ standing: 'shelved' });
    await site.rounds(3_600_000);
    expect((await all())[0]).toMatchObject({ standing: 'unacknowledged', suppressed_until: null });
    expect(await events()).toContain('shelf-expired');
    const untold = await site.service.ledger.read((reader) =>
      reader
        .selectFrom('to_tell')
        .select(['event', 'severity'])
        .where('event', '=', 'shelf-expired')
        .execute(),
    );
    expect(untold).toEqual([{ event: 'shelf-expired', severity: 'alert' }]);
  });

  test('can be ended before', async () => {
    await alarms('shelve', '1', '--for', '2 d', ...by);
    expect((await alarms('unshelve', '1', ...by)).out).toBe(
      'number 1, pump-2/de-v overall: shelved, now unacknowledged\n',
    );
    expect((await alarms('unshelve', '1', ...by)).err).toBe('number 1: it is not shelved\n');
  });
});

describe('out of service', () => {
  test('holds back everything of the machine, also what does not stand yet, until its time', async () => {
    const ran = await alarms('out-of-service', 'pump-2', '--until', '2026-03-04 12:00', ...by);
    expect(ran).toMatchObject({ status: 0, err: '' });
    expect(ran.out).toMatch(
      /^pump-2: out of service until 2026-03-04 12:00; \d standing alarms held back\n$/,
    );
    await site.rounds(20 * 3_600_000);
    const standing = await all();
    const ofPump = standing.filter(({ machine }) => machine === 'pump-2');
    expect(ofPump.map(({ standing: now }) => now)).toEqual(ofPump.map(() => 'out-of-service'));
    expect(ofPump.length).toBeGreaterThanOrEqual(1);
    expect((await alarms()).out).toMatch(/pump-2 +2026-03-04 12:00 +A\. Fitter +tank cleaning beside it/);
    expect(await status()).toMatch(/out of service +pump-2 until 2026-03-04 12:00, by A\. Fitter/);
    const { out: summary } = await run(['summary', '--text', '--site', site.file], { clock: site.clock });
    const said = summary.replace(/\s+/g, ' ');
    expect(said).toContain(
      'Out of service: Raw water pump 2 until Wed 4 Mar 2026, 12:00, by A. Fitter: tank cleaning beside it.',
    );
    expect(said).toContain('1 out of service');
  });

  test('cannot be ended for a point that is out with its machine, nor where it is not', async () => {
    expect((await alarms('in-service', 'pump-2/de-v', ...by)).err).toBe(
      'pump-2/de-v is out of service with its machine: put pump-2 in service\n',
    );
    expect((await alarms('in-service', 'blower-1', ...by)).err).toBe('blower-1 is not out of service\n');
    expect((await alarms('out-of-service', 'pump-3', '--until', '3 d', ...by)).err).toContain('pump-2');
    expect(await alarms('out-of-service', 'pump-2', '--until', '2020-01-01', ...by)).toMatchObject({
      status: 2,
      err: "--until: '2020-01-01' lies in the past\n",
    });
  });

  test('ends by name, with baselines anew where that is asked for', async () => {
    const ran = await alarms('in-service', 'pump-2', '--new-baseline', ...by);
    expect(ran.out).toMatch(
      /^pump-2: in service; \d standing alarms no longer held back; there is no baseline yet\n$/,
    );
    const told = await events();
    expect(told).toContain('baseline-begun-again');
    expect(told.filter((event) => event === 'in-service').length).toBeGreaterThanOrEqual(2);
    expect((await all()).filter(({ standing: now }) => now === 'out-of-service')).toEqual([]);
    const acts = readFileSync(join(site.folder, 'data', 'acts.log'), 'utf8');
    expect(acts).toContain('"command":"in-service pump-2 --new-baseline"');
  });

  test('of a point ends by itself, in the journal too', async () => {
    await alarms('out-of-service', 'pump-2/de-v', '--until', '3 h', ...by);
    await site.rounds(2 * 3_600_000);
    expect(await status()).toContain('pump-2/de-v until');
    await site.rounds(3_600_000);
    expect(await status()).not.toContain('pump-2/de-v until');
    expect((await all()).filter(({ standing: now }) => now === 'out-of-service')).toEqual([]);
    expect((await alarms('--journal', '--limit', '20')).out).toMatch(/in-service +pump-2\/de-v/);
    expect(existsSync(join(site.folder, 'data', 'acts.log'))).toBe(true);
  });
});
