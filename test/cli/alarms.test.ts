import { afterAll, beforeAll, describe, expect, test } from 'vitest';
import { readJournal } from '../../src/store/journal.ts';
import { livedInSite, run, type SmallSite } from './small-site.ts';

let site: SmallSite;
beforeAll(async () => {
  site = await livedInSite();
}, 60_000);
afterAll(() => site.remove());

const alarms = (...args: string[]) => run(['alarms', '--site', site.file, ...args], { clock: site.clock });

interface Standing {
  number: number;
  kind: string;
  trouble: string | null;
  standing: string;
  acknowledged_by: string | null;
  acknowledged_at: string | null;
}

async function all(): Promise<Standing[]> {
  const ran = await alarms('--json');
  expect(ran).toMatchObject({ status: 0, err: '' });
  return JSON.parse(ran.out) as Standing[];
}

async function standing(number: number): Promise<Standing | undefined> {
  return (await all()).find((one) => one.number === number);
}

describe('what stands', () => {
  test('is listed with level, limit, since and standing, while the service runs', async () => {
    const ran = await alarms();
    expect(ran).toMatchObject({ status: 0, err: '' });
    expect(ran.out).toContain(' 1  alert     pump-2/de-v overall  2026-03-02 08:00  unacknowledged\n');
    expect(ran.out).toMatch(
      /4\.4\d? mm\/s r\.m\.s\. on 2026-03-02 10:00, limit 2\.8 \(57 % over\); 3 recordings/,
    );
    expect(ran.out).toMatch(/^ \d {2}trouble {3}pump-2_<any>\.wav {5}2026-03-02 10:41 {2}unacknowledged$/m);
    expect(ran.out).toContain('shorter than its own header');
    expect(ran.out).toContain('humledger alarms acknowledge 1 --by NAME');
    expect(Math.max(...ran.out.split('\n').map((line) => line.length))).toBeLessThanOrEqual(80);
  });

  test('as JSON: levels and limits in the display unit, in full precision', async () => {
    expect(await standing(1)).toMatchObject({
      kind: 'alarm',
      severity: 'alert',
      machine: 'pump-2',
      point: 'de-v',
      band: 'overall',
      unit: 'mm/s',
      detector: 'rms',
      level: expect.closeTo(4.4, 1),
      alert: 2.8,
      danger: 7.1,
      since: '2026-03-02T08:00:00.000Z',
      recordings: 3,
      acknowledged_by: null,
    });
  });
});

describe('acknowledging', () => {
  test('takes it in hand beside the running service, with name, time and comment in the journal', async () => {
    const ran = await alarms(
      'acknowledge',
      '1',
      '--by',
      ' K. Example ',
      '--comment',
      'bearing\nordered\u001b[2J',
    );
    expect(ran).toEqual({
      status: 0,
      out: 'number 1, pump-2/de-v overall: unacknowledged, now acknowledged\n',
      err: '',
    });
    expect(await standing(1)).toMatchObject({
      standing: 'acknowledged',
      acknowledged_by: 'K. Example',
      acknowledged_at: new Date(site.clock.wallMs()).toISOString(),
    });
    const [row] = await site.service.ledger.read((reader) => readJournal(reader, { number: 1, limit: 1 }));
    expect(row).toMatchObject({
      event: 'acknowledged',
      actor: 'K. Example',
      via: 'command',
      wallMs: site.clock.wallMs(),
    });
    // What would act on a terminal is stored as something that is seen.
    expect(row?.comment).toBe('bearing ordered\ufffd[2J');
    const [own] = (
      await site.service.ledger.read((reader) => readJournal(reader, { number: 1, limit: 9 }))
    ).slice(-1);
    expect(own?.configVersionId).toBe(row?.configVersionId);
  });

  test('twice says by whom it is acknowledged already, exit status 1, and journals nothing', async () => {
    const before = await site.service.ledger.read((reader) => readJournal(reader, { number: 1, limit: 99 }));
    const ran = await alarms('acknowledge', '1', '--by', 'L. Example');
    expect(ran).toEqual({ status: 1, out: '', err: 'number 1: it is acknowledged already, by K. Example\n' });
    expect(await site.service.ledger.read((reader) => readJournal(reader, { number: 1, limit: 99 }))).toEqual(
      before,
    );
  });

  test('a number that never was, or is over, is said, exit status 1', async () => {
    expect(await alarms('acknowledge', '77', '--by', 'K')).toMatchObject({
      status: 1,
      err: 'there is no alarm or trouble number 77\n',
    });
    // The trouble returns with the next readable file of its logger, and ends once acknowledged.
    const number = (await all()).find(({ trouble }) => trouble === 'unreadable')?.number ?? 0;
    await site.hour(5);
    expect(await standing(number)).toMatchObject({ standing: 'returned-unacknowledged' });
    expect(await alarms('acknowledge', String(number), '--by', 'K')).toMatchObject({
      status: 0,
      out: `number ${number}, pump-2_<any>.wav: returned-unacknowledged, now normal\n`,
    });
    expect(await standing(number)).toBeUndefined();
    expect(await alarms('acknowledge', String(number), '--by', 'K')).toMatchObject({
      status: 1,
      err: `number ${number} does not stand any more: it is over\n`,
    });
  });

  test.each([
    [['acknowledge', 'x', '--by', 'K'], "'x' is no number of an alarm"],
    [['acknowledge', '0', '--by', 'K'], "'0' is no number of an alarm"],
    [['acknowledge', '1'], "required option '--by <name>'"],
    [['acknowledge', '1', '--by', ' '], '--by is empty'],
    [['acknowledge', '1', '--by', 'K'.repeat(101)], '--by is longer than 100 characters'],
    [['acknowledge', '1', '--by', 'K', '--comment', 'x'.repeat(1001)], '--comment is longer'],
    [['reset', '1', '--by', 'K'], "required option '--comment <text>'"],
  ])('%j is a wrong command line, exit status 2', async (args, message) => {
    const ran = await alarms(...args);
    expect(ran.status).toBe(2);
    expect(ran.err).toContain(message);
  });

  test('--site may stand behind the number too', async () => {
    const ran = await run(['alarms', 'acknowledge', '77', '--by', 'K', '--site', site.file]);
    expect(ran.err).toBe('there is no alarm or trouble number 77\n');
  });
});

test('what stands cannot be reset, and what does not latch needs no reset', async () => {
  // pump-2 has come back by now: hour 5 read 2 mm/s and its acknowledged alarm ended by itself.
  expect(await standing(1)).toBeUndefined();
  expect(await alarms('reset', '1', '--by', 'K', '--comment', 'why not')).toMatchObject({ status: 1 });
});

describe('the journal', () => {
  test('is read in pages, the newest page first, oldest row on top', async () => {
    const all = JSON.parse((await alarms('--journal', '--json', '--limit', '1000')).out) as {
      sequence: number;
    }[];
    const sequences = all.map(({ sequence }) => sequence);
    expect(sequences).toEqual([...sequences].sort((a, b) => a - b));
    const last = await alarms('--journal', '--limit', '2');
    const [first = 0] = sequences.slice(-2);
    expect(last.out).toContain(`older rows: --journal --before ${first}\n`);
    const page = JSON.parse(
      (await alarms('--journal', '--json', '--limit', '2', '--before', String(first))).out,
    );
    expect(page).toEqual(all.slice(-4, -2));
  });

  test('from a time on, in the site clock or a time back', async () => {
    const events = async (since: string) => {
      const ran = await alarms('--journal', '--json', '--since', since);
      return (JSON.parse(ran.out) as { event: string }[]).map(({ event }) => event);
    };
    expect((await events('2026-03-02'))[0]).toBe('started');
    expect((await events('2026-03-02T09:30'))[0]).toBe('raised');
    expect(await events('1 s')).not.toContain('started');
    expect(await alarms('--journal', '--since', 'yesterday')).toMatchObject({ status: 2 });
    expect(await alarms('--since', '1 d')).toMatchObject({ status: 2 });
    expect(await alarms('--journal', '--limit', '0')).toMatchObject({ status: 2 });
  });

  test('tells people what moved, by which level, and who did it', async () => {
    const { out } = await alarms('--journal');
    expect(out).toMatch(/raised +1 +pump-2\/de-v overall/);
    expect(out).toMatch(/normal to alert; 4\.2\d? mm\/s r\.m\.s\./);
    expect(out).toMatch(/acknowledged +1 +pump-2\/de-v overall +K\. Example/);
    expect(Math.max(...out.split('\n').map((line) => line.length))).toBeLessThanOrEqual(80);
  });
});
