/** What an alarm mail is made from, read from a real ledger. */
import { describe, expect, it } from 'vitest';
import { alarmMail } from '../../src/advisory/alarm-mail.ts';
import type { Evidence } from '../../src/manipulation/evidence.ts';
import type { SpectralPeak } from '../../src/manipulation/measurement.ts';
import { asAlarm } from '../../src/service/as-alarm.ts';
import { alarmMailFacts } from '../../src/service/draft.ts';
import { sendNow } from '../../src/service/send-now.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { ann, type BenchOptions, ben, dayMs, hourMs, MailBench, minuteMs } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

const peak = (frequencyHz: number, level: number, order: number | null = null): SpectralPeak => ({
  frequencyHz,
  level,
  aboveFloorDb: 20,
  kind: 'tone',
  order,
  names: [],
});

async function bench(options: BenchOptions = {}) {
  return MailBench.start({
    tree: { blower: { de: ['overall', 'low'], nde: ['overall'], top: ['overall'] } },
    ...options,
  });
}

async function untold(b: MailBench) {
  return b.ledger.read(async (reader) => {
    const events = await untoldEvents(reader, 100);
    const machineId = events.find((event) => event.machineId !== null)?.machineId ?? null;
    const own = events.filter((event) => event.machineId === machineId);
    return alarmMailFacts(reader, b.view, machineId, own, b.clock.wallMs());
  });
}

describe('the facts of an alarm', () => {
  it('hold the levels before: the last four, of a day and of a week before, all of the same series', async () => {
    const b = await bench();
    for (let hour = 0; hour < 8 * 24; hour++) {
      await b.record('blower/de', { overall: 1 + hour / 1000, low: 9e-9 }, { more: {} });
      b.clock.advance(hourMs);
    }
    await b.record('blower/de', { overall: 3, low: 9e-9 });
    const [alarm] = (await untold(b)).alarms;
    const mm = (level: number | undefined) => Math.round((level ?? 0) * 1e6) / 1e3;
    expect(alarm?.level).toMatchObject({ level: 0.003, intervalLow: 0.0027, confidencePercent: 95 });
    expect(alarm?.before.last.map(({ level }) => mm(level))).toEqual([1.191, 1.19, 1.189, 1.188]);
    expect(mm(alarm?.before.dayBefore?.level)).toBe(1.168);
    expect(mm(alarm?.before.weekBefore?.level)).toBe(1.024);
    expect(b.clock.wallMs() - (alarm?.before.weekBefore?.usedMs ?? 0)).toBe(7 * dayMs);
  });

  it('name the lines that rose against about a week ago, or against the oldest there is', async () => {
    const b = await bench();
    await b.record('blower/de', { overall: 1 }, { more: { peaks: [peak(49.5, 0.1, 1), peak(163, 0.02)] } });
    b.clock.advance(3 * dayMs);
    await b.record('blower/de', { overall: 3 }, { more: { peaks: [peak(163.4, 0.2), peak(49.5, 0.1, 1)] } });
    const lines = (await untold(b)).alarms[0]?.lines;
    expect(lines?.comparedWithMs).toBe(b.clock.wallMs() - 3 * dayMs);
    expect(lines?.display.quantity).toBe('acceleration');
    expect(lines?.lines).toEqual([
      { frequencyHz: 163.4, order: null, names: [], level: 0.2, levelBefore: 0.02 },
      { frequencyHz: 49.5, order: 1, names: [], level: 0.1, levelBefore: 0.1 },
    ]);
    b.clock.advance(8 * dayMs);
    await b.record('blower/de', { overall: 5 }, { more: { peaks: [peak(163.4, 0.4)] } });
    expect((await untold(b)).alarms[0]?.lines?.comparedWithMs).toBe(b.clock.wallMs() - 8 * dayMs);
  });

  it('tell the names of the lines and what they say of a part, which is never a verdict', async () => {
    const b = await bench();
    const bearing = { partId: 'bearing', fault: 'outer race', frequency: 'BPFO', expectedHz: 163 };
    const evidence: Evidence[] = [
      {
        ...bearing,
        spectrum: 'envelope',
        grade: 'clear',
        observedHz: 163.4,
        harmonics: 3,
        sidebands: 0,
        aboveFloorDb: 14,
        chance: 1e-6,
        words: 'three harmonics of BPFO of the bearing in the envelope (163.4 Hz), 14 dB over the floor',
      },
      {
        ...{
          partId: 'impeller',
          fault: 'vane pass',
          frequency: 'vane pass',
          spectrum: 'plain',
          grade: 'strong',
        },
        ...{
          isObservation: true,
          expectedHz: 275,
          observedHz: 275,
          harmonics: 3,
          sidebands: 6,
          aboveFloorDb: 20,
        },
        ...{ chance: 1e-9, words: 'six sidebands at 1x around three harmonics of the vane pass' },
      },
      {
        ...bearing,
        spectrum: 'plain',
        grade: 'not separable',
        neededLineSpacingHz: 0.1,
        words: 'BPFO of the bearing cannot be told from 3x',
      },
    ];
    const peaks = [{ ...peak(163.4, 0.2), names: ['BPFO, bearing'] }];
    await b.record('blower/de', { overall: 3 }, { more: { peaks, evidence } });
    const facts = await untold(b);
    expect(facts.alarms[0]?.evidence).toEqual([{ grade: 'clear', words: evidence[0]?.words }]);
    const text = alarmMail(facts).text.replace(/\s+/g, ' ');
    expect(text).toContain('163.4 Hz [BPFO, bearing] 0.2');
    expect(text).toContain('clear evidence, never a verdict: three harmonics of BPFO of the bearing');
    expect(text).toContain('something else may make such lines');
    expect(text).not.toContain('cannot be told from 3x');
  });

  it('show the other points of the machine, the band that is used most, nothing that is old', async () => {
    const b = await bench();
    await b.record('blower/top', { overall: 2 });
    b.clock.advance(5 * hourMs);
    await b.record('blower/nde', { overall: 1.4 });
    await b.record('blower/de', { overall: 3 });
    const others = (await untold(b)).alarms[0]?.otherPoints;
    expect(others?.map(({ point, share }) => [point.id, share])).toEqual([
      ['nde', 0.5],
      ['top', null],
    ]);
  });

  it('give a danger that outgrew an acknowledged alert a time to respond of its own, and no other', async () => {
    const b = await bench({ limit: { respondWithinMs: 2 * dayMs, sayAgainPercent: 25 } });
    const respondBy = async () => ((await untold(b)).alarms[0]?.respondByMs ?? 0) - 2 * dayMs;
    const beginMs = b.clock.wallMs();
    await b.record('blower/de', { overall: 3 });
    b.clock.advance(dayMs);
    await b.command(1, 'acknowledge');
    expect(await respondBy()).toBe(beginMs);
    b.clock.advance(3 * dayMs);
    const worseMs = b.clock.wallMs();
    await b.record('blower/de', { overall: 4 });
    expect(await respondBy()).toBe(worseMs);
    // Nobody has looked yet: the danger does not put off the time that people have.
    b.clock.advance(dayMs);
    await b.record('blower/de', { overall: 5 });
    expect((await untold(b)).alarms[0]).toMatchObject({ event: 'rose', severity: 'danger' });
    expect(await respondBy()).toBe(worseMs);
    await b.command(1, 'acknowledge');
    expect(await respondBy()).toBe(worseMs);
  });

  it('say what the recording was, and by when somebody should respond', async () => {
    const b = await bench({ limit: { respondWithinMs: 2 * dayMs, action: 'Check the base bolts' } });
    const quality = [{ flag: 'clipped', detail: '12 samples' }] as const;
    await b.record('blower/de', { overall: 3 }, { fromBacklog: true, more: { quality, loadPercent: 80 } });
    const firstMs = b.clock.wallMs();
    b.clock.advance(hourMs);
    await b.record('blower/de', { overall: 5 });
    const [alarm] = (await untold(b)).alarms;
    expect(alarm).toMatchObject({
      number: 1,
      event: 'rose',
      severity: 'danger',
      standing: 'unacknowledged',
      sinceMs: firstMs,
      recordings: 2,
      respondByMs: firstMs + 2 * dayMs,
      action: 'Check the base bolts',
      limit: { alert: 0.0028, danger: 0.0045, side: 'upper' },
      recording: { fileName: 'blower_2.wav', arrival: 'in-time', durationS: 10 },
    });
    b.clock.advance(hourMs);
    await b.command(1, 'acknowledge');
    await b.command(1, 'shelve', { untilMs: b.clock.wallMs() + dayMs });
    expect((await untold(b)).alarms[0]).toMatchObject({
      standing: 'shelved',
      suppressedUntilMs: b.clock.wallMs() + dayMs,
      acknowledgedBy: 'K. Example',
      acknowledgedMs: b.clock.wallMs(),
    });
  });

  it('of a trouble say what was found, and when something usable last came', async () => {
    const b = await bench();
    await b.record('blower/de', { overall: 1 });
    const goodMs = b.clock.wallMs();
    b.clock.advance(3 * hourMs);
    await b.look('overdue', true, { machineId: 'blower', pointId: 'de' });
    const [trouble] = (await untold(b)).troubles;
    expect(trouble).toMatchObject({
      trouble: 'overdue',
      detail: 'overdue found',
      lastGoodMs: goodMs,
      expectedEveryMs: hourMs,
      recordings: 0,
      event: 'raised',
    });
  });
});

describe('a mail that somebody asks for', () => {
  it('shows the alarm mail of the newest recording, marked TEST, and raises nothing', async () => {
    const server = await MailServerOnLoopback.start();
    const b = await bench({ port: server.port });
    const point = b.view.point('blower/de');
    if (point === undefined || b.view.site.mail === null) throw new Error('no such point, or no mail');
    const ask = () => b.ledger.read((reader) => asAlarm(reader, b.view, point, b.clock.wallMs()));
    expect(await ask()).toMatchObject({
      refused: expect.stringContaining('there is no level of blower/de yet'),
    });
    await b.record('blower/de', { overall: 1.4, low: 2.1 });
    const facts = await ask();
    if ('refused' in facts) throw new Error(facts.refused);
    server.atRecipient = (recipient) => (recipient === ben ? 550 : undefined);
    const sent = await sendNow(alarmMail(facts), {
      settings: b.view.site.mail,
      recipients: [ann, ben, ann],
      about: 'test alarm',
      nowMs: b.clock.wallMs(),
    });
    expect(sent.map(({ recipient, answer }) => [recipient, answer.kind])).toEqual([
      [ann, 'accepted'],
      [ben, 'never'],
    ]);
    expect(server.to(ann).map(({ subject }) => subject)).toEqual([
      'TEST: ALERT: blower, de, low 2.1 mm/s r.m.s.',
    ]);
    await b.pass(10 * minuteMs);
    expect(server.got.length).toBe(1);
  });
});

describe('a start', () => {
  it('is told when it is the first or follows an unclean stop, at most once an hour, and else not', async () => {
    const server = await MailServerOnLoopback.start();
    const b = await bench({ port: server.port, to: [{ address: ann }] });
    await b.rounds.announce('first');
    await b.pass(1000);
    expect(server.got.map(({ mail }) => mail.subject)).toEqual([
      'Larkfen Waterworks: service started for the first time',
    ]);
    expect(server.got[0]?.mail.text).toContain('1 machine, 3 points, 4 limits');
    for (let index = 0; index < 5; index++) {
      b.restart();
      await b.rounds.announce('unclean');
      await b.pass(9 * minuteMs);
    }
    expect(server.got.length).toBe(1);
    await b.pass(30 * minuteMs);
    await b.rounds.announce('clean');
    await b.pass(minuteMs);
    expect(server.got.length).toBe(1);
    await b.rounds.announce('unclean');
    await b.pass(minuteMs);
    expect(server.got[1]?.mail.subject).toContain('unclean stop');
  });
});
