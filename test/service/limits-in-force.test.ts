/** Learned limits from recording to mail, summary and status, on a real ledger. */
import { describe, expect, it } from 'vitest';
import { alarmMail } from '../../src/advisory/alarm-mail.ts';
import { summaryMail } from '../../src/advisory/summary-mail.ts';
import type { Limit, Machine } from '../../src/config/site.ts';
import { asAlarm } from '../../src/service/as-alarm.ts';
import { alarmMailFacts } from '../../src/service/draft.ts';
import { limitFactsNow, limitsInForce, unwatchedLimits } from '../../src/service/limits-in-force.ts';
import { addNote, orderBaseline } from '../../src/service/machine-acts.ts';
import { gatherSummary } from '../../src/service/summary-gather.ts';
import { trendOfBand } from '../../src/service/trend-of-band.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { newestMeasurement } from '../../src/store/read-measurements.ts';
import { dayMs, hourMs, MailBench } from './mail-bench.ts';

const statistical: Partial<Limit> = {
  kind: 'statistical',
  alert: null,
  danger: 0.0045,
  rule: { by: 'spread', alert: 4.5, danger: null },
  onDelay: { recordings: 3 },
};

async function bench(limit: Partial<Limit> = statistical, machine: Partial<Machine> = {}) {
  return MailBench.start({ tree: { blower: { de: ['overall'] } }, limit, machine });
}

/** Eight recordings a day, 10 % about the level; a third of those expected, so that each is a running day. */
async function days(b: MailBench, count: number, level: number, more: object = {}): Promise<void> {
  for (let n = 0; n < 8 * count; n++) {
    await b.record('blower/de', { overall: level * (1 + 0.1 * Math.sin(1.7 * n)) }, { more });
    b.clock.advance(3 * hourMs);
  }
}

const point = (b: MailBench) => {
  const found = b.view.point('blower/de');
  if (found === undefined) throw new Error('no point');
  return found;
};
const place = (b: MailBench) => ({ machine: b.view.machine('blower'), point: null });
const person = (b: MailBench) =>
  ({ by: 'A. Fitter', comment: 'bearing replaced', via: 'command', wallMs: b.clock.wallMs() }) as const;

async function limitNow(b: MailBench) {
  const [only] = await b.ledger.read(async (reader) => {
    const pointId = b.view.ids.pointId('blower', 'de');
    const newest = await newestMeasurement(reader, pointId, { evaluated: true });
    return limitsInForce(reader, b.view, point(b), newest);
  });
  if (only === undefined) throw new Error('no limit');
  return limitFactsNow(only);
}

const untold = (b: MailBench) =>
  b.ledger.read(async (reader) => {
    const events = await untoldEvents(reader, 100);
    return alarmMailFacts(reader, b.view, b.view.ids.machineId('blower'), events, b.clock.wallMs());
  });
const summary = (b: MailBench) =>
  gatherSummary({ ledger: b.ledger, view: b.view, nowMs: b.clock.wallMs(), upSinceMs: 0 });
/** As one line: where a mail breaks its lines is not the matter here. */
const words = (text: string) => text.replace(/\s+/g, ' ');

describe('a statistical limit', () => {
  it('judges nothing before seven running days, and mail, summary and status say so', async () => {
    const b = await bench({ ...statistical, danger: null });
    await days(b, 3, 1);
    await b.record('blower/de', { overall: 9 });
    const why = 'no baseline yet: 3 of 7 running days';
    expect(await limitNow(b)).toMatchObject({ alert: null, danger: null, unknown: why });
    expect((await untold(b)).alarms).toEqual([]);
    const unwatched = await b.ledger.read((reader) => unwatchedLimits(reader, b.view, b.clock.wallMs()));
    expect(unwatched).toMatchObject([{ limit: { id: 'overall-upper' }, why }]);
    const { text } = summaryMail(await summary(b));
    expect(words(text)).toContain(`1 band not judged, ${why}: blower, de (overall).`);
    expect(words(text)).toContain('0 of 1 point judged, 1 not judged');
    const test = await b.ledger.read((reader) => asAlarm(reader, b.view, point(b), b.clock.wallMs()));
    expect(test).toEqual({ refused: `blower/de: overall-upper: ${why}` });
  });

  it('stands wide while provisional; its mail says where and why, with the baseline beside the levels', async () => {
    const b = await bench();
    await days(b, 8, 1);
    const now = await limitNow(b);
    expect(now).toMatchObject({ danger: 0.0045, provisional: true });
    // Eight days: at least 11 % of spread, so that 4.5 of them are 64 %.
    expect((now.alert ?? 0) * 1000).toBeCloseTo(Math.exp(4.5 * 0.11), 1);
    for (let n = 0; n < 3; n++) {
      await b.record('blower/de', { overall: 2.5 });
      b.clock.advance(hourMs);
    }
    const facts = await untold(b);
    const [alarm] = facts.alarms;
    expect(alarm).toMatchObject({ severity: 'alert', limit: { danger: 0.0045, provisional: true } });
    expect((alarm?.before.baseline ?? 0) * 1000).toBeCloseTo(1, 1);
    const text = words(alarmMail(facts).text);
    expect(text).toMatch(
      /Limit from alert at 4\.5 spreads of 12 % above [\d.]+ mm\/s, the median of 8 running days; provisional baseline/,
    );
    expect(text).toMatch(/; baseline (1\.0|0\.9)\d* /);
    expect(words(summaryMail(await summary(b)).text)).toContain(
      'Provisional baselines: 1, 8 of 30 running days: blower, de (overall).',
    );
  });

  it('of a mail is the one that was decided by, whatever was learned since', async () => {
    const b = await bench();
    await days(b, 8, 1);
    for (let n = 0; n < 3; n++) {
      await b.record('blower/de', { overall: 2.5 });
      b.clock.advance(hourMs);
    }
    const before = (await untold(b)).alarms[0]?.limit;
    await days(b, 2, 1.3);
    expect((await limitNow(b)).alert).not.toBeCloseTo(before?.alert ?? 0, 6);
    expect((await untold(b)).alarms[0]?.limit).toEqual(before);
    await addNote(
      b.ledger,
      place(b),
      { kind: 'repair', atMs: b.clock.wallMs(), found: null, comment: null },
      person(b),
    );
    expect((await limitNow(b)).unknown).toBe('alert: no baseline yet: 0 of 7 running days');
    expect((await untold(b)).alarms[0]?.limit).toEqual(before);
    expect(before?.alert).toBeGreaterThan(0.0016);
  });

  it('is reckoned from a refused baseline only where somebody stands for it, who is then named', async () => {
    const zones = await import('../config/site-parts.ts').then(
      ({ siteOf, exampleText }) => siteOf(exampleText).machines[0]?.zones ?? null,
    );
    const b = await bench(statistical, { zones, runningSpeedHz: 49.5 });
    // Group 2, rigid: zone C begins at 2.8 mm/s.
    await days(b, 8, 3);
    expect((await limitNow(b)).unknown).toBe('alert: the baseline is refused: it lies in zone C or D');
    expect(words(summaryMail(await summary(b)).text)).toContain(
      "Baselines refused, no limit is reckoned from them: blower, de (overall): it lies in zone C or D. See 'humledger baseline blower'",
    );
    expect(await orderBaseline(b.ledger, place(b), { kind: 'confirm' }, person(b))).toMatchObject({
      baselines: 1,
    });
    expect(await limitNow(b)).toMatchObject({ confirmedBy: 'A. Fitter' });
    await days(b, 1, 3);
    expect((await limitNow(b)).confirmedBy).toBe('A. Fitter');
    expect(words(summaryMail(await summary(b)).text)).toContain(
      'Baseline confirmed by A. Fitter: blower, de (overall).',
    );
    for (let n = 0; n < 3; n++) await b.record('blower/de', { overall: 4.4 + 2 });
    expect(words(alarmMail(await untold(b)).text)).toContain('baseline confirmed by A. Fitter');
  });
});

describe('a repair', () => {
  it('leaves no level before it beside those after, in mail, summary and trend', async () => {
    const b = await bench({ onDelay: { recordings: 1 } });
    await days(b, 9, 1);
    const atMs = b.clock.wallMs() - hourMs;
    await addNote(
      b.ledger,
      place(b),
      { kind: 'repair', atMs, found: 'outer ring pitted', comment: null },
      person(b),
    );
    await b.record('blower/de', { overall: 1.2 });
    b.clock.advance(4 * hourMs);
    await b.record('blower/de', { overall: 3 });
    const facts = await untold(b);
    const [alarm] = facts.alarms;
    expect(alarm?.before).toMatchObject({
      dayBefore: null,
      weekBefore: null,
      baseline: null,
      broken: { kind: 'repair', atMs },
    });
    expect(alarm?.before.last.map(({ level }) => level)).toEqual([0.0012]);
    expect(words(alarmMail(facts).text)).toMatch(
      /the last 1, newest first\); nothing from before the repair of/,
    );
    const { points } = await summary(b);
    expect(points[0]?.bands[0]?.change).toBeNull();
    const trend = await b.ledger.read((reader) =>
      trendOfBand(reader, b.view.machine('blower'), point(b), point(b).bands[0] as never, {
        fromMs: 0,
        toMs: Number.MAX_SAFE_INTEGER,
        limit: 100,
        timeZone: 'Europe/Dublin',
      }),
    );
    expect('notes' in trend ? trend.notes : []).toMatchObject([
      { kind: 'repair', found: 'outer ring pitted' },
    ]);
  });
});

describe('operating conditions', () => {
  const conditions = [
    { id: 'full', speedHz: null, loadPercent: { from: 60, to: 100 } },
    { id: 'part', speedHz: null, loadPercent: { from: 0, to: 60 } },
  ];

  it('are never compared with each other: change, baseline and limit are those of one', async () => {
    const b = await bench(statistical, { conditions });
    for (let n = 0; n < 16 * 9; n++) {
      const full = n % 2 === 0;
      const level = (full ? 2 : 0.5) * (1 + 0.05 * Math.sin(1.7 * n));
      await b.record('blower/de', { overall: level }, { more: { loadPercent: full ? 90 : 30 } });
      b.clock.advance(1.5 * hourMs);
    }
    expect(await limitNow(b)).toMatchObject({ provisional: true });
    expect((await limitNow(b)).alert).toBeLessThan(0.001);
    // A day at full load only, after a week of both.
    for (let n = 0; n < 16; n++) {
      await b.record('blower/de', { overall: 2 }, { more: { loadPercent: 90 } });
      b.clock.advance(1.5 * hourMs);
    }
    await b.record('blower/de', { overall: 2 }, { more: { loadPercent: 90 } });
    expect((await limitNow(b)).alert).toBeGreaterThan(0.003);
    const { points } = await summary(b);
    expect(points[0]?.bands[0]?.change?.ratio).toBeCloseTo(1, 1);
    expect(points[0]?.bands[0]?.baselines?.map(({ condition, state }) => [condition, state])).toEqual([
      ['full', 'provisional'],
      ['part', 'provisional'],
    ]);
    // Outside both nobody can say what is usual.
    await b.record('blower/de', { overall: 2 }, { more: { loadPercent: null } });
    expect((await limitNow(b)).unknown).toBe('alert: the machine ran in none of its operating conditions');
  });

  it('hold a limit to those that it names', async () => {
    const b = await bench({ conditions: ['full'] }, { conditions });
    await b.record('blower/de', { overall: 9 }, { more: { loadPercent: 30 } });
    expect((await untold(b)).alarms).toEqual([]);
    expect((await limitNow(b)).unknown).toBe('it holds in full only; the machine ran in part');
    await b.record('blower/de', { overall: 9 }, { more: { loadPercent: 90 } });
    expect((await untold(b)).alarms).toMatchObject([{ limit: { alert: 0.0028 } }]);
  });
});

describe('limits over speed and on growth', () => {
  it('over speed are shown where the recording ran', async () => {
    const values = [
      { at: 10, alert: 0.001, danger: null },
      { at: 50, alert: 0.003, danger: null },
    ];
    const b = await bench({
      kind: 'curve',
      alert: null,
      danger: null,
      rule: { by: 'curve', over: 'speed', values },
    });
    const speed = { rpm: 1800, origin: 'pulses', uncertaintyRpm: 1 } as const;
    await b.record('blower/de', { overall: 1 }, { more: { speed: { ...speed, steadiness: null } as never } });
    expect(await limitNow(b)).toMatchObject({ alert: 0.002, reasons: { alert: '1800 rpm of its curve' } });
    b.clock.advance(hourMs);
    await b.record('blower/de', { overall: 1 });
    expect((await limitNow(b)).unknown).toBe('the recording has no measured speed');
  });

  it('on growth compare the line through the levels, and share and mail follow the line', async () => {
    const rule = { by: 'rate', overMs: 7 * dayMs, alert: 1.5, danger: null } as const;
    const b = await bench({ kind: 'rate', alert: null, danger: null, rule, onDelay: { recordings: 1 } });
    for (let n = 0; n < 43; n++) {
      await b.record('blower/de', { overall: 1.7 ** (n / 42) });
      b.clock.advance(4 * hourMs);
    }
    const now = await limitNow(b);
    expect(now.compared).toBeCloseTo(0.0017, 4);
    expect(now.reasons?.alert).toMatch(/^1\.5 times 1 mm\/s, its line 7 d before$/);
    const text = words(alarmMail(await untold(b)).text);
    expect(text).toMatch(
      /Limit its line now 1\.\d+ mm\/s r\.m\.s\.; alert 1\.\d+ mm\/s r\.m\.s\.: \d+(\.\d)? % over/,
    );
  });
});
