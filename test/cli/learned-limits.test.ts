/** What the commands say of limits that are learned, and of notes. */
import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { run, type SmallSite, siteText, smallSite } from './small-site.ts';

let site: SmallSite;
beforeAll(async () => {
  site = await smallSite(
    siteText.replace(
      '        alert: 2.8 mm/s\n        danger: 7.1 mm/s\n',
      '        kind: statistical\n      - band: overall\n        danger: 7.1 mm/s\n      - band: overall\n        kind: curve\n        curve:\n          - speed: 1500 rpm\n            alert: 2 mm/s\n          - speed: 3000 rpm\n            alert: 4 mm/s\n',
    ),
  );
  for (const hour of [0, 1, 2, 3, 4, 5, 6, 20]) await site.hour(hour);
}, 60_000);
afterAll(() => site.remove());

const command = (...args: string[]) => run([...args, '--site', site.file], { clock: site.clock });
const json = async (...args: string[]) => JSON.parse((await command(...args, '--json')).out);
const words = (text: string) => text.replace(/\s+/g, ' ');
const why = 'no baseline yet: 1 of 7 running days';

describe('a limit that cannot be reckoned yet', () => {
  test('has no value in check, and says why; the others of its band stand', async () => {
    const { out, status } = await command('check');
    expect(status).toBe(0);
    expect(out).toMatch(/^ +de-h +overall .* not yet +not yet$/m);
    expect(words(out)).toContain(`overall, not reckoned now: ${why}`);
    expect(words(out)).toContain('overall, not reckoned now: the recording has no measured speed');
    expect(out).toContain('9 limits (6 not reckoned now)');
    const [limit, fixed] = (await json('check')).machines[0].points[0].bands[0].limits;
    expect(limit).toMatchObject({ kind: 'statistical', alert: null, danger: null, not_reckoned: why });
    expect(fixed).toMatchObject({ kind: 'fixed', danger: 7.1, not_reckoned: null });
  });

  test('is named by status, the first of all', async () => {
    const { out } = await command('status');
    expect(words(out)).toContain(
      `not reckoned limit overall-statistical-upper of blower-1/de-h: ${why}; and 5 more, see humledger check`,
    );
    const { limits_not_reckoned: all } = await json('status');
    expect(all).toHaveLength(6);
    expect(all[0]).toEqual({
      machine: 'blower-1',
      point: 'de-h',
      band: 'overall',
      limit: 'overall-statistical-upper',
      why,
    });
  });

  test('says so at the head of the trend', async () => {
    const { out } = await command('trend', 'blower-1/de-h', 'overall');
    expect(words(out)).toContain(`overall-statistical-upper: not reckoned now: ${why}`);
    expect(words(out)).toContain('danger above 7.1 mm/s r.m.s. (overall-fixed-upper)');
  });
});

describe('a note', () => {
  test('draws a line across the trend, and stands in the journal under its machine', async () => {
    const by = ['--by', 'A. Fitter'];
    await command(
      'note',
      'pump-2',
      'repair',
      '--at',
      '2026-03-02 09:30',
      '--found',
      'outer ring pitted',
      ...by,
    );
    await command(
      'note',
      'pump-2/de-v',
      'lubricated',
      '--at',
      '2026-03-02 10:30',
      '--comment',
      '20 g',
      ...by,
    );
    const { out } = await command('trend', 'pump-2/de-v', 'overall');
    const lines = out.split('\n');
    const at = lines.findIndex((line) => line.includes('--- repair, 2026-03-02 09:30, A. Fitter'));
    expect(lines[at - 1]).toContain('09:00');
    expect(words(lines.slice(at, at + 3).join(' '))).toContain(
      'found: outer ring pitted; do not compare with levels above',
    );
    expect(out).toMatch(/^ *lubricated, 2026-03-02 10:30, A\. Fitter; 20 g$/m);
    expect((await json('trend', 'pump-2/de-v', 'overall')).notes).toMatchObject([
      { time: '2026-03-02T09:30:00.000Z', note: 'repair', whole_machine: true, found: 'outer ring pitted' },
      { note: 'lubricated', whole_machine: false, comment: '20 g' },
    ]);
    expect((await json('trend', 'blower-1/de-h', 'overall')).notes).toEqual([]);
    const journal = await command('alarms', '--journal');
    expect(journal.out).toMatch(/ note +pump-2 +A\. Fitter/);
    expect(words(journal.out)).toContain('repair, found: outer ring pitted');
    expect((await json('alarms', '--journal')).at(-1)).toMatchObject({ event: 'note', about: 'pump-2/de-v' });
  });
});
