import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { readJournal } from '../../src/store/journal.ts';
import { notesOf } from '../../src/store/notes.ts';
import { run, type SmallSite, smallSite } from './small-site.ts';

let site: SmallSite;
beforeAll(async () => {
  site = await smallSite();
  // Seven hours of one day, and the first recording of the next.
  for (const hour of [0, 1, 2, 3, 4, 5, 6, 20]) await site.hour(hour);
}, 60_000);
afterAll(() => site.remove());

const command = (name: string, ...args: string[]) =>
  run([name, ...args, '--site', site.file], { clock: site.clock });
const baselines = async (place: string) =>
  JSON.parse((await command('baseline', place, '--json')).out) as Record<string, unknown>[];
const by = ['--by', 'A. Fitter', '--comment', 'drive end bearing replaced'];

describe('the baseline', () => {
  test('is shown with what it was learned from, while the service runs', async () => {
    const ran = await command('baseline', 'blower-1');
    expect(ran).toMatchObject({ status: 0, err: '' });
    expect(ran.out).toMatch(/^blower-1\/de-h overall +learning +1\.5\d* mm\/s r\.m\.s\. +12 % +1$/m);
    expect(ran.out).toContain('learning: no limit is reckoned from it before 7 running days');
    expect(Math.max(...ran.out.split('\n').map((line) => line.length))).toBeLessThanOrEqual(80);
    expect(await baselines('pump-2/de-v')).toMatchObject([
      {
        machine: 'pump-2',
        band: 'overall',
        condition: null,
        state: 'learning',
        unit: 'mm/s',
        running_days: 1,
        recordings: 7,
        from: '2026-03-02T06:00:00.000Z',
      },
    ]);
  });

  test('is frozen by name and comment, once', async () => {
    const ran = await command('baseline', 'blower-1/de-h', '--freeze', ...by);
    expect(ran).toEqual({ status: 0, out: 'blower-1/de-h: 1 baseline frozen\n', err: '' });
    expect(await baselines('blower-1/de-h')).toMatchObject([
      { state: 'frozen', confirmed_by: 'A. Fitter', confirm_comment: 'drive end bearing replaced' },
    ]);
    const again = await command('baseline', 'blower-1/de-h', '--freeze', ...by);
    expect(again).toMatchObject({ status: 1, out: '' });
    expect(again.err).toContain('there is no baseline to freeze');
    const journal = await site.service.ledger.read((reader) => readJournal(reader, { limit: 1 }));
    expect(journal).toMatchObject([
      { event: 'baseline-frozen', actor: 'A. Fitter', via: 'command', reason: { place: 'blower-1/de-h' } },
    ]);
  });

  test('is learned again from now on; an order needs a name and a comment', async () => {
    expect(await command('baseline', 'blower-1', '--learn-again', '--by', 'A. Fitter')).toEqual({
      status: 2,
      out: '',
      err: 'give --by and --comment: who orders it, and why\n',
    });
    expect(await command('baseline', 'blower-1', '--learn-again', ...by)).toMatchObject({ status: 0 });
    expect(await baselines('blower-1')).toMatchObject([
      { state: 'learning', recordings: 0, confirmed_by: null },
      { state: 'learning', recordings: 0 },
    ]);
  });
});

describe('a note', () => {
  test('of a repair begins the baselines anew, and stands in the journal and beside the ledger', async () => {
    const ran = await command('note', 'pump-2', 'repair', '--found', 'outer ring pitted', ...by);
    expect(ran).toMatchObject({ status: 0, err: '' });
    expect(ran.out).toMatch(
      /^pump-2: repair noted for 2026-03-03 02:00; 1 baseline is learned anew from then on/,
    );
    expect(await baselines('pump-2')).toMatchObject([{ state: 'learning', recordings: 0 }]);
    const { ledger } = site.service;
    const [entry] = await ledger.read((reader) => readJournal(reader, { limit: 1 }));
    expect(entry).toMatchObject({
      event: 'note',
      actor: 'A. Fitter',
      comment: 'drive end bearing replaced',
      reason: { place: 'pump-2', note: 'repair', found: 'outer ring pitted' },
    });
    const notes = await ledger.read((reader) => notesOf(reader, { fromMs: 0, toMs: 1e15 }));
    expect(notes).toMatchObject([{ kind: 'repair', pointId: null, found: 'outer ring pitted' }]);
  });

  test('is refused where place, kind or time cannot be', async () => {
    expect((await command('note', 'pump-3', 'repair', ...by)).err).toContain("did you mean 'pump-2'?");
    expect(await command('note', 'pump-2', 'repaired', ...by)).toMatchObject({ status: 2 });
    const ahead = await command('note', 'pump-2', 'remark', '--at', '2030-01-01', ...by);
    expect(ahead).toEqual({ status: 2, out: '', err: '--at lies in the future\n' });
  });
});
