/** Trends from a real ledger: which days take part, in which time, and against which limit. */
import { describe, expect, it } from 'vitest';
import { alarmMail } from '../../src/advisory/alarm-mail.ts';
import type { TrendFacts } from '../../src/advisory/trend-words.ts';
import type { TrendLine } from '../../src/prognosis/trend.ts';
import { alarmMailFacts } from '../../src/service/draft.ts';
import { trendOfLevel } from '../../src/service/trend-facts.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { insertNote, type NoteKind } from '../../src/store/notes.ts';
import { newestMeasurement } from '../../src/store/read-measurements.ts';
import { seededRandom } from '../signal/random.ts';
import { type BenchOptions, dayMs, hourMs, MailBench } from './mail-bench.ts';

const bench = (options: BenchOptions = {}) =>
  MailBench.start({ tree: { blower: { de: ['overall'] } }, ...options });

/** A recording every two hours; the level's course over days in mm/s, 3 % from one to the next. */
async function live(
  b: MailBench,
  days: number,
  course: (day: number, step: number) => number,
  more: (step: number) => Parameters<MailBench['record']>[2] = () => ({}),
): Promise<void> {
  const random = seededRandom(20261201);
  for (let step = 0; step < 12 * days; step++) {
    const level = course(step / 12, step) * Math.exp(0.03 * random.gaussian());
    await b.record('blower/de', { overall: level }, more(step));
    b.clock.advance(2 * hourMs);
  }
}

async function trend(b: MailBench): Promise<TrendFacts> {
  const point = b.view.point('blower/de');
  if (point === undefined) throw new Error('no such point');
  return b.ledger.read(async (reader) => {
    const measurement = await newestMeasurement(reader, b.view.ids.pointId('blower', 'de'));
    if (measurement === null) throw new Error('nothing measured');
    const [level] = measurement.levels;
    const facts = await trendOfLevel(reader, b.view, {
      point,
      measurement,
      level,
      knownUntilMs: b.clock.wallMs(),
    });
    if (facts === null) throw new Error('no level');
    return facts;
  });
}

async function note(b: MailBench, kind: NoteKind, atMs = b.clock.wallMs()): Promise<void> {
  const machineId = b.view.ids.machineId('blower');
  await b.ledger.transact((writer) =>
    insertNote(writer, {
      ...{ machineId, pointId: null, kind, atMs, wallMs: atMs },
      ...{ found: null, by: 'A. Fitter', comment: null },
    }),
  );
}

const doubling = (day: number) => 2 ** (day / 30);

describe('the trend of a band', () => {
  it('rises by its daily medians over the hours that the machine ran, towards the limit that it has not passed', async () => {
    const b = await bench();
    await live(b, 31, doubling);
    const facts = await trend(b);
    const line = facts.trend as TrendLine;
    expect(line).toMatchObject({ kind: 'rising', days: 30 });
    expect(line.growth).toBeGreaterThan(1.8);
    expect(line.growth).toBeLessThan(2.1);
    expect(facts).toMatchObject({ time: 'running', condition: '', broken: null });
    // 2 mm/s after 31 days, 2.8 mm/s a further half doubling away.
    expect(facts.ahead).toMatchObject({ severity: 'alert', at: 0.0028, limit: 'overall-upper' });
    expect(Math.abs((facts.ahead?.time.days ?? 0) - 14)).toBeLessThan(3);
    expect(facts.ahead?.time.earliestDays).toBeLessThan(14);
    expect(facts.ahead?.time.latestDays).toBeGreaterThan(14);
  });

  it('falls towards a lower limit; one that guards the other side lies not ahead', async () => {
    const lower = { side: 'lower', alert: 0.0004, danger: 0.0002 } as const;
    const falling = await bench({ limit: lower });
    await live(falling, 25, (day) => 2 ** (-day / 20));
    expect(await trend(falling)).toMatchObject({
      trend: { kind: 'falling' },
      ahead: { severity: 'alert', at: 0.0004 },
    });
    const away = await bench({ limit: { ...lower, alert: 0.0028 } });
    await live(away, 25, doubling);
    expect(await trend(away)).toMatchObject({ trend: { kind: 'rising' }, ahead: null });
  });

  it('is told in the alarm mail, with the time to danger once the alert is passed', async () => {
    const b = await bench();
    await live(b, 46, doubling);
    const mail = await b.ledger.read(async (reader) => {
      const events = await untoldEvents(reader, 100);
      return alarmMail(
        await alarmMailFacts(reader, b.view, events[0]?.machineId ?? null, events, b.clock.wallMs()),
      );
    });
    const text = mail.text.replace(/\s+/g, ' ');
    expect(text).toMatch(
      /Trend Rose by \d+ % over 30 running days \(p < 0.001\); if it went on so, it would reach the danger limit \(4.5 mm\/s r.m.s.\) in about \d+ days of running, between \d+ and \d+ \(90 %\). A projection, not a promise./,
    );
  });

  it('counts only the time of running: standing still does not wear', async () => {
    const b = await bench();
    // Two weeks of rest in the middle; the level goes on where it was.
    await live(b, 16, doubling);
    b.clock.advance(14 * dayMs);
    await live(b, 16, (day) => doubling(day + 16));
    const facts = await trend(b);
    const line = facts.trend as TrendLine;
    expect(line.kind).toBe('rising');
    expect(line.toMs - line.fromMs).toBeGreaterThan(40 * dayMs);
    expect(Math.log(2) / Math.log(line.growthPerDay)).toBeCloseTo(30, -1);
  });

  it('goes by the calendar where the ledger does not know how long the machine ran', async () => {
    const b = await bench();
    await live(b, 25, doubling);
    await b.ledger.transact((writer) =>
      writer
        .updateTable('daily_levels')
        .set({ running_hours: null })
        .where('used_ms', '<', b.clock.wallMs() - 9 * dayMs)
        .execute(),
    );
    const facts = await trend(b);
    expect(facts).toMatchObject({ time: 'calendar', trend: { kind: 'rising' } });
    expect(Math.log(2) / Math.log((facts.trend as TrendLine).growthPerDay)).toBeCloseTo(30, -1);
  });

  it('waits for 21 running days', async () => {
    const b = await bench();
    await live(b, 15, doubling);
    expect((await trend(b)).trend).toEqual({ kind: 'too-few-days', days: 15, needed: 21 });
  });

  it('tells a jump as a step', async () => {
    const b = await bench();
    await live(b, 31, (day) => (day < 24 ? 1 : 1.8));
    const { trend: step, ahead } = await trend(b);
    expect(step).toMatchObject({ kind: 'step', daysSince: 7 });
    expect(ahead).toBeNull();
  });

  it('is withdrawn after a repair or a changed sensor, and begins anew the day after', async () => {
    const b = await bench();
    await live(b, 31, doubling);
    await note(b, 'remark');
    await note(b, 'balanced');
    expect((await trend(b)).trend.kind).toBe('rising');
    await note(b, 'repair');
    const repairedMs = b.clock.wallMs();
    expect(await trend(b)).toMatchObject({
      trend: { kind: 'too-few-days', days: 0 },
      broken: { kind: 'repair', atMs: repairedMs },
      ahead: null,
    });
    await live(b, 4, () => 1);
    expect((await trend(b)).trend).toMatchObject({ kind: 'too-few-days', days: 3 });
    await note(b, 'sensor-changed');
    expect((await trend(b)).broken?.kind).toBe('sensor-changed');
  });

  it('is of one operating condition: from part load to full load is no step and no rise', async () => {
    const conditions = [
      { id: 'part', speedHz: null, loadPercent: { from: 0, to: 50 } },
      { id: 'full', speedHz: null, loadPercent: { from: 50, to: 100 } },
    ];
    const b = await bench({ machine: { conditions } });
    for (const [days, load] of [
      [10, 80],
      [12, 30],
      [12, 80],
    ] as const) {
      const level = load / 40;
      await live(
        b,
        days,
        () => level,
        () => ({ more: { loadPercent: load } }),
      );
    }
    const facts = await trend(b);
    expect(facts.condition).toBe('full');
    expect(facts.trend).toMatchObject({ kind: 'none', days: 23 });
  });

  it('of a recording in a seldom condition is that of the condition with the days, without a limit ahead', async () => {
    const conditions = [
      { id: 'part', speedHz: null, loadPercent: { from: 0, to: 50 } },
      { id: 'full', speedHz: null, loadPercent: { from: 50, to: 100 } },
    ];
    const b = await bench({ machine: { conditions } });
    await live(b, 31, doubling, () => ({ more: { loadPercent: 80 } }));
    await b.record('blower/de', { overall: 0.5 }, { more: { loadPercent: 20 } });
    expect(await trend(b)).toMatchObject({ condition: 'full', trend: { kind: 'rising' }, ahead: null });
  });
});
