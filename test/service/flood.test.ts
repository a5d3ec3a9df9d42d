/**
 * Floods of alarms, hours of recipients and the night: which mails leave when. A real ledger, a real SMTP server on loopback,
 * a clock that the test moves.
 */
import type { ParsedMail } from 'mailparser';
import { describe, expect, it } from 'vitest';
import { type Hours, parseHours } from '../../src/config/hours.ts';
import { readJournal } from '../../src/store/journal.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { ann, type BenchOptions, ben, dayMs, hourMs, MailBench, minuteMs } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

const fans = Array.from({ length: 30 }, (_, index) => `fan-${index + 1}`);
const tree = Object.fromEntries(fans.map((fan) => [fan, { de: ['overall'] }]));

async function bench(options: BenchOptions = {}) {
  const server = await MailServerOnLoopback.start();
  return {
    server,
    bench: await MailBench.start({ port: server.port, tree, to: [{ address: ann }], ...options }),
  };
}
const subjects = (mails: readonly ParsedMail[]) => mails.map(({ subject }) => subject);
const flat = (mail: ParsedMail | undefined) => mail?.text?.replace(/\s+/g, ' ') ?? '';
const references = ({ references: all }: ParsedMail) => (all === undefined ? [] : [all].flat());
const hours = (text: string): Hours => {
  const parsed = parseHours(text);
  if (!parsed.ok) throw new Error(parsed.what);
  return parsed.value;
};
/** Alerts of so many machines, one every ten seconds. */
async function alerts(b: MailBench, from: number, count: number, level = 3): Promise<void> {
  for (const fan of fans.slice(from, from + count)) {
    await b.record(`${fan}/de`, { overall: level });
    await b.pass(10_000);
  }
}
const untold = async (b: MailBench) => (await b.ledger.read((reader) => untoldEvents(reader, 100))).length;

describe('a flood of alarms', () => {
  it('is one mail when the gathering is over, and one when it has ended; then machines speak for themselves again', async () => {
    const { server, bench: b } = await bench();
    await alerts(b, 0, 14);
    await b.pass(5 * minuteMs, 30_000);
    expect(subjects(server.to(ann))).toEqual(['Larkfen Waterworks: alarm flood, 14 alarms']);
    const [first] = server.to(ann) as [ParsedMail];
    for (const number of [1, 7, 14]) expect(first.text).toContain(`ALERT ${number} `);
    expect(flat(first)).toContain('More than 10 came within 10 minutes');
    expect(first.headers.get('auto-submitted')).toBe('auto-generated');
    // Three more while it lasts, then nothing: over when fewer than five came in ten minutes.
    await alerts(b, 14, 3);
    await b.pass(20 * minuteMs, 30_000);
    const [, second] = server.to(ann) as [ParsedMail, ParsedMail];
    expect(subjects(server.to(ann)).slice(1)).toEqual([
      'Larkfen Waterworks: alarm flood is over, 17 alarms in all',
    ]);
    for (const number of [15, 16, 17]) expect(second.text).toContain(`ALERT ${number} `);
    expect(second.text).not.toContain('ALERT 14 ');
    expect(references(second)).toEqual([first.messageId]);
    const journal = await b.ledger.read((reader) => readJournal(reader, { key: 'flood:1', limit: 9 }));
    expect(journal.map(({ event }) => event)).toEqual(['flood-ended', 'flood-begun']);
    await alerts(b, 17, 1);
    await b.pass(5 * minuteMs, 30_000);
    expect(subjects(server.to(ann)).slice(2)).toEqual(['ALERT 18: fan-18, de, overall 3 mm/s r.m.s.']);
    expect(await untold(b)).toBe(0);
  });

  it('begins with the eleventh alarm, not with the tenth', async () => {
    const { server, bench: b } = await bench();
    await alerts(b, 0, 10);
    await b.pass(30 * minuteMs, 30_000);
    expect(server.got.length).toBe(10);
    expect(subjects(server.to(ann)).join()).not.toContain('flood');
  });

  it('names a danger first and at once, with all that waits; later alarms of it wait for the next mail', async () => {
    const { server, bench: b } = await bench();
    await alerts(b, 0, 12);
    expect(server.got).toEqual([]);
    await b.record('fan-20/de', { overall: 6 });
    await b.pass(10_000);
    expect(subjects(server.to(ann))).toEqual([
      'DANGER 13: fan-20, de, overall 6 mm/s r.m.s. and 12 more (alarm flood)',
    ]);
    const [mail] = server.to(ann) as [ParsedMail];
    expect(flat(mail)).toMatch(/^Begin with danger 13, fan-20: /);
    const marks = [...(mail.text ?? '').matchAll(/(DANGER|ALERT) (\d+) /g)].map(([, mark]) => mark);
    expect(marks[0]).toBe('DANGER');
    expect(mail.text).toContain('Recording  ');
    await alerts(b, 20, 3);
    await b.record('fan-25/de', { overall: 6 });
    await b.pass(10_000);
    expect(subjects(server.to(ann)).slice(1)).toEqual([
      'DANGER 17: fan-25, de, overall 6 mm/s r.m.s. and 3 more (alarm flood)',
    ]);
    await b.pass(30 * minuteMs, 30_000);
    expect(server.got.length).toBe(3);
    expect(server.got[2]?.mail.subject).toContain('alarm flood is over');
    expect(await untold(b)).toBe(0);
  });

  it('that goes on is told once an hour, and everybody hears of his own machines only', async () => {
    const { server, bench: b } = await bench({
      to: [{ address: ann }, { address: ben, machines: ['fan-3', 'fan-30'] }],
    });
    await alerts(b, 0, 12);
    for (let n = 0; n < 120; n++) {
      // Troubles of the logger come and go, fast enough to keep it up.
      await b.look('unreadable', n % 2 === 0, { source: `logger ${n % 14}` });
      await b.look('clock', n % 2 === 0, { source: `logger ${n % 14}` });
      await b.look('overdue', true, { machineId: fans[n % 30] ?? null, pointId: 'de' });
      await b.pass(minuteMs);
    }
    const during = server.to(ann).length;
    expect(during).toBeGreaterThanOrEqual(2);
    expect(during).toBeLessThanOrEqual(4);
    await b.pass(30 * minuteMs, minuteMs);
    expect(server.to(ben)[0]?.text).toContain('fan-3,');
    expect(server.to(ben)[0]?.text).not.toContain('fan-4,');
    expect(server.to(ben).at(-1)?.subject).toContain('flood is over');
    expect(await untold(b)).toBe(0);
  });

  it('is none where a backlog raised the alarms', async () => {
    const { server, bench: b } = await bench();
    b.backlogRuns = true;
    for (const fan of fans.slice(0, 12)) await b.record(`${fan}/de`, { overall: 3 }, { fromBacklog: true });
    b.backlogRuns = false;
    await b.pass(10 * minuteMs, minuteMs);
    expect(server.got.length).toBe(12);
    expect(subjects(server.to(ann)).join()).not.toContain('flood');
  });

  it('of reminders is one mail too', async () => {
    const { server, bench: b } = await bench({
      mail: { reminders: { afterMs: 4 * hourMs, thenTo: [], thenAfter: { reminders: 2 } } },
    });
    await alerts(b, 0, 12);
    await b.pass(25 * minuteMs, 30_000);
    const before = server.got.length;
    await b.pass(4 * hourMs, minuteMs);
    expect(server.got[before]?.mail.subject).toBe('Larkfen Waterworks: alarm flood, 12 alarms');
    expect(flat(server.got[before]?.mail)).toContain('Reminder 1: told');
    expect(server.got.length).toBe(before + 2);
  });
});

describe('the night', () => {
  const night = { holdDuring: hours('22:00..06:00') };

  it('holds alerts and troubles, then one mail a machine; danger leaves at once and takes along what is held of its machine', async () => {
    const { server, bench: b } = await bench({ mail: night });
    await b.pass(15 * hourMs, hourMs);
    // 23:00.
    await b.record('fan-1/de', { overall: 3 });
    await b.look('overdue', true, { machineId: 'fan-1', pointId: 'de' });
    await b.record('fan-2/de', { overall: 3 });
    await b.record('fan-3/de', { overall: 3 });
    await b.pass(2 * hourMs, 10 * minuteMs);
    expect(server.got).toEqual([]);
    await b.record('fan-3/de', { overall: 6 });
    await b.pass(minuteMs, 10_000);
    expect(subjects(server.to(ann))).toEqual(['DANGER 4: fan-3, de, overall 6 mm/s r.m.s.']);
    const round = await b.rounds.round();
    expect(round.againInMs).toBe(5 * hourMs - minuteMs);
    await b.pass(5 * hourMs - 2 * minuteMs, 10 * minuteMs);
    expect(server.got.length).toBe(1);
    await b.pass(minuteMs, 10_000);
    expect(subjects(server.to(ann)).slice(1).sort()).toEqual([
      'ALERT 1: fan-1, de, overall 3 mm/s r.m.s. (and 1 more)',
      'ALERT 3: fan-2, de, overall 3 mm/s r.m.s.',
    ]);
  });

  it('keeps a flood of alerts for the morning, in one mail that says when it was', async () => {
    const { server, bench: b } = await bench({ mail: night });
    await b.pass(17 * hourMs, hourMs);
    await alerts(b, 0, 13);
    await b.pass(4 * hourMs, 10 * minuteMs);
    expect(server.got).toEqual([]);
    await b.pass(hourMs, 10 * minuteMs);
    expect(subjects(server.to(ann))).toEqual(['Larkfen Waterworks: alarm flood is over, 13 alarms in all']);
    expect(flat(server.to(ann)[0])).toContain('Wed 2 Dec 2026, 01:00 to 01:12');
  });
});

describe('hours of recipients', () => {
  const shifts: BenchOptions['to'] = [
    { address: ann, hours: hours('mon..fri 06:00..18:00') },
    { address: ben, severities: ['danger'], hours: hours('18:00..22:00') },
  ];

  it('an alert waits for the first hour that somebody has; a danger goes to whoever has the hour', async () => {
    const { server, bench: b } = await bench({ to: shifts });
    await b.pass(11 * hourMs, hourMs);
    // Tuesday 19:00.
    await b.record('fan-1/de', { overall: 3 });
    await b.record('fan-2/de', { overall: 6 });
    await b.pass(hourMs, 10 * minuteMs);
    expect(subjects(server.to(ben))).toEqual(['DANGER 2: fan-2, de, overall 6 mm/s r.m.s.']);
    expect(server.to(ann)).toEqual([]);
    await b.pass(10 * hourMs - minuteMs, 10 * minuteMs);
    expect(server.to(ann)).toEqual([]);
    await b.pass(2 * minuteMs, minuteMs);
    expect(subjects(server.to(ann))).toEqual(['ALERT 1: fan-1, de, overall 3 mm/s r.m.s.']);
    expect(server.to(ben).length).toBe(1);
  });

  it('a danger goes to everybody where nobody has the hour, and leaves the alerts of its machine waiting', async () => {
    const { server, bench: b } = await bench({ to: shifts });
    await b.pass(16 * hourMs, hourMs);
    // Midnight.
    await b.record('fan-1/de', { overall: 3 });
    await b.look('overdue', true, { machineId: 'fan-2', pointId: 'de' });
    await b.record('fan-2/de', { overall: 6 });
    await b.pass(hourMs, 10 * minuteMs);
    expect(subjects(server.to(ann))).toEqual(['DANGER 3: fan-2, de, overall 6 mm/s r.m.s.']);
    expect(server.to(ben).length).toBe(1);
    await b.pass(6 * hourMs, 10 * minuteMs);
    expect(subjects(server.to(ann)).slice(1).sort()).toEqual([
      'ALERT 1: fan-1, de, overall 3 mm/s r.m.s.',
      'TROUBLE 2: fan-2, de: overdue',
    ]);
  });

  it('a weekend without hours holds what came until Monday, and a mail that waits for the server leaves at any hour', async () => {
    const { server, bench: b } = await bench({
      to: [{ address: ann, hours: hours('mon..fri 06:00..18:00') }],
    });
    await b.pass(3 * dayMs + 9 * hourMs, 3 * hourMs);
    // Friday 17:00.
    server.atData = () => 451;
    await b.record('fan-1/de', { overall: 3 });
    await b.pass(2 * hourMs, 5 * minuteMs);
    server.atData = () => undefined;
    await b.pass(hourMs, 5 * minuteMs);
    expect(server.to(ann).length).toBe(1);
    await b.record('fan-2/de', { overall: 3 });
    await b.pass(2 * dayMs + 9 * hourMs, hourMs);
    expect(server.to(ann).length).toBe(1);
    await b.pass(2 * hourMs, hourMs);
    expect(subjects(server.to(ann)).slice(1)).toEqual(['ALERT 2: fan-2, de, overall 3 mm/s r.m.s.']);
  });
});
