/** What the morning says of weeks: trends, sister machines, repairs. From a real ledger. */
import { describe, expect, it } from 'vitest';
import type { SummaryFacts } from '../../src/advisory/summary-facts.ts';
import { summaryMail } from '../../src/advisory/summary-mail.ts';
import { sistersOf } from '../../src/service/sister-facts.ts';
import { gatherSummary } from '../../src/service/summary-gather.ts';
import { insertNote, type NoteKind } from '../../src/store/notes.ts';
import { machineWith } from '../detection/site-parts.ts';
import { seededRandom } from '../signal/random.ts';
import { type BenchOptions, dayMs, hourMs, MailBench } from './mail-bench.ts';

const random = seededRandom(20261201);

/** Every six hours a recording of each point; levels in mm/s, 3 % from one to the next. */
async function live(b: MailBench, days: number, course: (path: string, day: number) => number) {
  for (let step = 0; step < 4 * days; step++) {
    b.clock.advance(6 * hourMs);
    for (const { machineId, id } of b.view.points) {
      const level = course(`${machineId}/${id}`, step / 4) * Math.exp(0.03 * random.gaussian());
      await b.record(`${machineId}/${id}`, { overall: level });
    }
  }
}

const facts = (b: MailBench): Promise<SummaryFacts> =>
  gatherSummary({ ledger: b.ledger, view: b.view, nowMs: b.clock.wallMs(), upSinceMs: 0 });

const said = (summary: SummaryFacts) => summaryMail(summary).text.replace(/\s+/g, ' ');

async function note(b: MailBench, machine: string, kind: NoteKind, atMs: number): Promise<void> {
  const machineId = b.view.ids.machineId(machine);
  await b.ledger.transact((writer) =>
    insertNote(writer, {
      ...{ machineId, pointId: null, kind, atMs, wallMs: atMs },
      ...{ found: null, by: 'A. Fitter', comment: 'new bearing' },
    }),
  );
}

const blowers = (options: BenchOptions = {}) =>
  MailBench.start({
    tree: { one: { de: ['overall'] }, two: { de: ['overall'] }, three: { de: ['overall'] } },
    machine: { like: ['one', 'two', 'three'] },
    ...options,
  });

describe('the summary', () => {
  it('names a rise that no limit has seen, with the time to its limit', async () => {
    const b = await MailBench.start({ tree: { blower: { de: ['overall'], nde: ['overall'] } } });
    await live(b, 31, (path, day) => (path === 'blower/de' ? 2 ** (day / 30) : 1));
    const text = said(await facts(b));
    expect(text).toMatch(
      /WORSE, NO LIMIT PASSED - blower, de: overall up [\d.]+ % on the week .*? Rose by \d+ % over 30 running days, alert \(2.8 mm\/s r.m.s.\) in about \d+ days? of running, between \d+ and \d+ \(90 %\), if it went on so ALREADY/,
    );
    expect(text).toContain('STEADY OR BETTER 1 of 2 points.');
    expect(text).toContain('A projection, not a promise.');
  }, 30_000);

  it('names a machine that leaves its sisters, and not the sisters', async () => {
    const b = await blowers();
    await live(b, 25, (path, day) => (path === 'two/de' && day >= 20 ? 2 : 1));
    const summary = await facts(b);
    expect(said(summary)).toMatch(
      /Leaves its sisters: (1\.9|2|2\.1) times the median of one, three \(1 before\)/,
    );
    const found = summary.points.map(({ machine, bands }) => [machine.id, bands[0]?.sister?.leaves ?? null]);
    expect(found).toEqual([
      ['one', null],
      ['two', true],
      ['three', null],
    ]);
  }, 30_000);

  it('says in one line which machine lies above its sisters as before, and calls it not worse', async () => {
    const b = await blowers();
    await live(b, 15, (path) => (path === 'two/de' ? 2 : 1));
    const text = said(await facts(b));
    expect(text).toMatch(/Above their sister machines, as before: two, de \(overall (1\.9|2|2\.1) times\)\./);
    expect(text).toContain('WORSE, NO LIMIT PASSED Nothing rose by more than its ordinary spread.');
  }, 30_000);

  it('compares no machine with a sister whose band has other edges, nor in another operating condition', async () => {
    const b = await blowers();
    const two = b.view.site.machines[1]?.points[0];
    if (two === undefined) throw new Error('no point');
    await live(b, 25, (path, day) => (path === 'two/de' && day >= 20 ? 2 : 1));
    const other = { ...two, bands: two.bands.map((band) => ({ ...band, to: band.to * 2 })) };
    const machines = b.view.site.machines.map((machine) =>
      machine.id === 'two' ? { ...machine, points: [other] } : machine,
    );
    const view = { ...b.view, site: { ...b.view.site, machines } };
    const { points } = await gatherSummary({ ledger: b.ledger, view, nowMs: b.clock.wallMs(), upSinceMs: 0 });
    expect(points.every(({ bands }) => bands.every(({ sister }) => sister == null))).toBe(true);
  }, 30_000);

  it('compares fourteen days before a repair with the days since, while they last', async () => {
    const b = await MailBench.start({ tree: { pump: { de: ['overall', 'low'] } } });
    await live(b, 20, () => 2.4);
    await note(b, 'pump', 'repair', b.clock.wallMs());
    expect((await facts(b)).repairs).toMatchObject([{ daysSince: 0, bands: [] }]);
    expect(said(await facts(b))).toContain('The first whole day after it is not over yet.');
    await live(b, 5, () => 0.8);
    const summary = await facts(b);
    const [repair] = summary.repairs ?? [];
    expect(repair).toMatchObject({ kind: 'repair', daysSince: 4, point: null });
    expect(repair?.bands).toMatchObject([
      { band: { id: 'overall' }, before: { days: 14 }, after: { days: 4 } },
    ]);
    const text = said(summary);
    expect(text).toMatch(
      /AFTER REPAIRS - pump: repair of Mon 21 Dec 2026, by A. Fitter: new bearing; 4 of 14 days after it de, overall: down 6\d %, from 2.\d+ to 0.\d+ mm\/s r.m.s./,
    );
    expect(text).toContain('BEFORE AND AFTER, PUMP: REPAIR OF MON 21 DEC 2026');
    // No trend and no change reaches across it.
    expect(summary.points[0]?.bands[0]).toMatchObject({ trend: { trend: { kind: 'too-few-days' } } });
    await live(b, 9, () => 0.8);
    expect((await facts(b)).repairs).toMatchObject([{ daysSince: 13 }]);
    b.clock.advance(3 * dayMs);
    expect((await facts(b)).repairs).toEqual([]);
  }, 30_000);
});

describe('sister machines', () => {
  const machine = (id: string, like: readonly string[]) => machineWith({ id, like });

  it('are those named on either side, and their sisters', () => {
    const of = (...machines: Parameters<typeof sistersOf>[0]) =>
      Object.fromEntries([...sistersOf(machines)].map(([id, others]) => [id, others.map((one) => one.id)]));
    expect(of(machine('a', ['b']), machine('b', []), machine('c', ['b']), machine('d', ['gone']))).toEqual({
      a: ['b', 'c'],
      b: ['a', 'c'],
      c: ['a', 'b'],
      d: [],
    });
    expect(of(machine('a', ['b']), machine('b', ['a']), machine('c', ['d', 'a']), machine('d', []))).toEqual({
      a: ['b', 'c', 'd'],
      b: ['a', 'c', 'd'],
      c: ['a', 'b', 'd'],
      d: ['a', 'b', 'c'],
    });
  });
});
