/**
 * Told again: reminders of what nobody has acknowledged, the next recipients, what still stands long after somebody
 * acknowledged it. A real ledger, a real SMTP server on loopback, a clock that the test moves.
 */
import type { ParsedMail } from 'mailparser';
import { describe, expect, it } from 'vitest';
import type { ReminderSettings } from '../../src/config/site.ts';
import { readJournal } from '../../src/store/journal.ts';
import { outboxCounts } from '../../src/store/threads.ts';
import { ann, type BenchOptions, ben, dayMs, hourMs, MailBench, minuteMs } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

const chief = 'chief@larkfen.example';
const usual: ReminderSettings = { thenTo: [], thenAfter: { reminders: 2 } };

async function bench(options: BenchOptions = {}) {
  const server = await MailServerOnLoopback.start();
  const bench = await MailBench.start({
    port: server.port,
    to: [{ address: ann }],
    mail: { reminders: usual },
    ...options,
  });
  return { server, bench };
}
const leads = (mails: readonly ParsedMail[]) => mails.map(({ text }) => text?.split('\n')[0]);
/** Without the breaks of its lines. */
const flat = (mail: ParsedMail | undefined) => mail?.text?.replace(/\s+/g, ' ') ?? '';
const references = ({ references: all }: ParsedMail) => (all === undefined ? [] : [all].flat());
const events = async (b: MailBench, event: string) =>
  (await b.ledger.read((reader) => readJournal(reader, { limit: 200 }))).filter((row) => row.event === event);

describe('a danger that nobody acknowledges', () => {
  it('is told again after 1, 3, 7, 15, 31 and 55 hours, in its thread and under its subject, and then left to the summary', async () => {
    const { server, bench: b } = await bench();
    await b.record('blower/de', { overall: 6 });
    await b.pass(minuteMs, 10_000);
    const begun = server.got.length;
    expect(begun).toBe(1);
    const at: number[] = [];
    const beganMs = b.clock.wallMs();
    for (let n = 0; n < 5 * 24 * 4; n++) {
      const before = server.got.length;
      await b.pass(15 * minuteMs);
      if (server.got.length > before) at.push(Math.round((b.clock.wallMs() - beganMs) / hourMs));
    }
    expect(at).toEqual([1, 3, 7, 15, 31, 55]);
    const mails = server.to(ann);
    const [first] = mails as [ParsedMail];
    for (const mail of mails.slice(1)) {
      expect(mail.subject).toBe(first.subject);
      expect(references(mail)[0]).toBe(first.messageId);
    }
    expect(new Set(mails.map(({ messageId }) => messageId)).size).toBe(7);
    expect(leads(mails)[1]).toMatch(/^Nobody has acknowledged this yet\. /);
    expect(flat(mails[2])).toContain(
      'Reminder 2: told Tue 1 Dec 2026, 08:00, and nobody has acknowledged it.',
    );
    expect(mails[2]?.text).toContain('humledger alarms acknowledge 1 --by NAME');
    const journal = await events(b, 'reminded');
    expect(journal.map(({ reason }) => reason.reminder).reverse()).toEqual([1, 2, 3, 4, 5, 6]);
    expect(journal[0]).toMatchObject({
      key: 'limit:blower/de/overall/overall-upper',
      number: 1,
      actor: 'service',
    });
  });

  it('is not told again once somebody has acknowledged it, nor when it is back to normal', async () => {
    const { server, bench: b } = await bench();
    await b.record('blower/de', { overall: 6 });
    await b.record('blower/nde', { overall: 6 });
    await b.pass(90 * minuteMs, 10 * minuteMs);
    expect(server.got.length).toBe(2);
    expect(server.got[1]?.mail.subject).toContain('DANGER 1');
    await b.command(1, 'acknowledge');
    await b.record('blower/nde', { overall: 1 });
    await b.pass(2 * dayMs, hourMs);
    expect(server.got.length).toBe(2);
  });

  it('is not told again after an acknowledgement that comes while the reminder waits for the server', async () => {
    const { server, bench: b } = await bench();
    await b.record('blower/de', { overall: 6 });
    await b.pass(minuteMs, 10_000);
    server.atRecipient = () => 451;
    await b.pass(2 * hourMs, 10 * minuteMs);
    expect((await b.ledger.read(outboxCounts)).deliveries).toMatchObject({ waiting: 1, accepted: 1 });
    await b.command(1, 'acknowledge');
    server.atRecipient = () => undefined;
    await b.pass(dayMs, 10 * minuteMs);
    expect(server.got.length).toBe(1);
    expect((await b.ledger.read(outboxCounts)).deliveries).toMatchObject({ waiting: 0, superseded: 1 });
  });

  it('does not count time in which no server took its mail, and reminds once of what waits', async () => {
    const { server, bench: b } = await bench();
    server.atData = () => 451;
    await b.record('blower/de', { overall: 6 });
    await b.pass(5 * hourMs, 10 * minuteMs);
    expect(await events(b, 'reminded')).toEqual([]);
    server.atData = () => undefined;
    await b.pass(59 * minuteMs, 5 * minuteMs);
    expect(server.got.length).toBe(1);
    await b.pass(20 * minuteMs, 5 * minuteMs);
    expect(server.got.length).toBe(2);
  });

  it('is told anew, not as a reminder, when it was shelved and still stands afterwards; and reminders begin anew', async () => {
    const { server, bench: b } = await bench();
    await b.record('blower/de', { overall: 6 });
    await b.pass(minuteMs, 10_000);
    await b.command(1, 'shelve', { untilMs: b.clock.wallMs() + 8 * hourMs });
    await b.pass(8 * hourMs, 30 * minuteMs);
    expect(server.got.length).toBe(1);
    await b.command(1, 'shelf-expired');
    await b.pass(minuteMs, 10_000);
    expect(server.got.length).toBe(2);
    await b.pass(70 * minuteMs, 10 * minuteMs);
    expect(server.got.length).toBe(3);
    expect(server.got[2]?.mail.text).toContain('Reminder 1');
  });
});

describe('reminders', () => {
  it('are of what was told last: an alert that came again after a danger is no danger, and one that is, has its own subject', async () => {
    const { server, bench: b } = await bench({ mail: { reminders: { ...usual, afterMs: 2 * hourMs } } });
    const record = async (...levels: number[]) => {
      for (const overall of levels) {
        await b.record('blower/de', { overall });
        await b.pass(10 * minuteMs);
      }
    };
    // A danger that nobody acknowledges, back to normal, then an alert: one life of one alarm.
    await record(6, 6, 1, 3, 3);
    await b.pass(3 * hourMs, 10 * minuteMs);
    await record(9, 9);
    expect(server.to(ann).map(({ subject }) => subject?.replace(/: .* overall /, ' '))).toEqual([
      'DANGER 1 6 mm/s r.m.s.',
      'ALERT 1 3 mm/s r.m.s.',
      'ALERT 1 3 mm/s r.m.s.',
      'DANGER 1 9 mm/s r.m.s.',
    ]);
    expect(flat(server.to(ann)[2])).toContain('Reminder 1: told ');
  });

  it('of alerts and troubles there are none unless the site file asks for them', async () => {
    const { server, bench: b } = await bench();
    await b.record('blower/de', { overall: 3 });
    await b.look('overdue', true, { machineId: 'blower', pointId: 'nde' });
    await b.pass(3 * dayMs, hourMs);
    expect(server.got.length).toBe(1);
  });

  it('come as mail says, and as the limit says where it says something', async () => {
    const { server, bench: b } = await bench({
      mail: { reminders: { ...usual, afterMs: 4 * hourMs } },
      limit: { remindAfterMs: null },
    });
    await b.record('blower/de', { overall: 6 });
    await b.look('overdue', true, { machineId: 'blower', pointId: 'nde' });
    await b.pass(5 * hourMs, 10 * minuteMs);
    // The limit wants none; the trouble of the same machine has one.
    expect(server.got.length).toBe(2);
    expect(server.got[1]?.mail.subject).toBe('TROUBLE 2: blower, nde: overdue');
    expect(server.got[1]?.mail.text).not.toContain('DANGER');
  });

  it('go to the next recipient after two, in one mail with the others, named in it', async () => {
    const { server, bench: b } = await bench({
      limit: { remindAfterMs: 4 * hourMs, thenTo: [chief] },
    });
    await b.record('blower/de', { overall: 3 });
    await b.pass(27 * hourMs, 30 * minuteMs);
    expect(server.to(chief)).toEqual([]);
    await b.pass(2 * hourMs, 30 * minuteMs);
    expect(server.to(ann).length).toBe(4);
    expect(server.to(chief).length).toBe(1);
    const [mail] = server.to(chief) as [ParsedMail];
    expect(mail.subject).toBe('ALERT 1: blower, de, overall 3 mm/s r.m.s.');
    expect(flat(mail)).toContain(`Now told as well: ${chief}.`);
    expect(mail.messageId).not.toBe(server.to(ann)[3]?.messageId);
    expect(references(mail)).toEqual([]);
  });

  it('are worded by the newest level', async () => {
    const { server, bench: b } = await bench();
    await b.record('blower/de', { overall: 6 });
    await b.pass(30 * minuteMs, 10 * minuteMs);
    await b.record('blower/de', { overall: 7 });
    await b.pass(hourMs, 10 * minuteMs);
    expect(server.got.length).toBe(2);
    expect(server.got[1]?.mail.text).toContain('overall 7 mm/s');
  });
});

describe('an acknowledged alarm that still stands', () => {
  it('is told again when say_again_after is over, and waits for a person again', async () => {
    const { server, bench: b } = await bench({
      limit: { sayAgainAfterMs: 7 * dayMs, sayAgainPercent: null },
    });
    await b.record('blower/de', { overall: 3 });
    await b.pass(5 * minuteMs);
    await b.command(1, 'acknowledge');
    await b.pass(7 * dayMs - hourMs, 6 * hourMs);
    expect(server.got.length).toBe(1);
    await b.pass(2 * hourMs, 10 * minuteMs);
    expect(server.got.length).toBe(2);
    const [first, again] = server.to(ann) as [ParsedMail, ParsedMail];
    expect(flat(again)).toContain(
      'Told again: K. Example acknowledged it Tue 1 Dec 2026, 08:05, and it still stands.',
    );
    expect(flat(again)).toContain('humledger alarms acknowledge 1 --by NAME');
    expect(references(again)).toEqual([first.messageId]);
    expect((await events(b, 'still-stands')).length).toBe(1);
    await b.command(1, 'acknowledge');
    await b.record('blower/de', { overall: 1 });
    await b.pass(8 * dayMs, 12 * hourMs);
    expect(server.got.length).toBe(2);
  });

  it('is not while it is shelved', async () => {
    const { server, bench: b } = await bench({ limit: { sayAgainAfterMs: dayMs } });
    await b.record('blower/de', { overall: 3 });
    await b.pass(5 * minuteMs);
    await b.command(1, 'acknowledge');
    await b.command(1, 'shelve', { untilMs: b.clock.wallMs() + 9 * dayMs });
    await b.pass(3 * dayMs, 6 * hourMs);
    expect(server.got.length).toBe(1);
  });
});

it('reminders of an address that the server refuses for good are made all the same, for whoever comes next', async () => {
  const { server, bench: b } = await bench({
    to: [{ address: ben }],
    limit: { remindAfterMs: hourMs, thenTo: [chief] },
  });
  server.atRecipient = (recipient) => (recipient === ben ? 550 : undefined);
  await b.record('blower/de', { overall: 6 });
  await b.pass(8 * hourMs, 10 * minuteMs);
  expect(server.to(chief).length).toBe(1);
});
