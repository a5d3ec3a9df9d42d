/**
 * Which mails an alarm's life brings, seen from the recipient's side: a real ledger, a real SMTP server on loopback, a clock
 * that the test moves.
 */
import type { ParsedMail } from 'mailparser';
import { describe, expect, it } from 'vitest';
import { lookAtTrouble, sourceTrouble } from '../../src/service/evaluate.ts';
import { saveAlarmChange } from '../../src/store/save-alarm.ts';
import { ann, ben, dayMs, hourMs, MailBench, minuteMs } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

async function bench(options: Parameters<typeof MailBench.start>[0] = {}) {
  const server = await MailServerOnLoopback.start();
  return { server, bench: await MailBench.start({ port: server.port, ...options }) };
}

const subjects = (mails: readonly ParsedMail[]) => mails.map(({ subject }) => subject);
const references = ({ references: all }: ParsedMail) => (all === undefined ? [] : [all].flat());

describe('the mails of an alarm', () => {
  it('are one when it is raised, one when it rises, none when it is acknowledged or returns; all in one thread', async () => {
    const { server, bench: b } = await bench({
      to: [{ address: ann }],
      limit: { respondWithinMs: 2 * dayMs },
    });
    await b.record('blower/de', { overall: 2 });
    await b.pass(hourMs);
    expect(server.got).toEqual([]);

    await b.record('blower/de', { overall: 3.1 });
    await b.pass(4 * minuteMs);
    expect(server.got).toEqual([]);
    await b.pass(minuteMs);
    expect(subjects(server.to(ann))).toEqual(['ALERT 1: blower, de, overall 3.1 mm/s r.m.s.']);
    const [first] = server.to(ann) as [ParsedMail];
    expect(first.headers.get('auto-submitted')).toBe('auto-generated');
    expect(first.messageId).toMatch(/^<[0-9a-f]{40}@larkfen\.example>$/);
    expect(references(first)).toEqual([]);
    expect(first.text).toContain('2 mm/s r.m.s. (the last 1, newest first)');
    expect(first.text).toContain('humledger alarms acknowledge 1 --by NAME');
    expect(first.text).toContain('Respond by Thu 3 Dec 2026');

    await b.pass(55 * minuteMs);
    await b.record('blower/de', { overall: 5 });
    await b.pass(10_000);
    expect(subjects(server.to(ann)).slice(1)).toEqual(['DANGER 1: blower, de, overall 5 mm/s r.m.s.']);
    const second = server.to(ann)[1] as ParsedMail;
    expect(references(second)).toEqual([first.messageId]);
    expect(second.inReplyTo).toBe(first.messageId);
    expect(second.text).toContain('Risen from alert to danger.');

    await b.command(1, 'acknowledge');
    await b.pass(hourMs);
    await b.record('blower/de', { overall: 2 });
    await b.pass(hourMs, 10 * minuteMs);
    expect(server.got.length).toBe(2);
  });

  it('carry the picture of the trend, within 300 kB, where there are levels enough for one', async () => {
    const { server, bench: b } = await bench({ to: [{ address: ann }] });
    for (let hour = 0; hour < 30; hour++) {
      await b.record('blower/de', { overall: 2 + 0.01 * hour });
      await b.pass(hourMs);
    }
    await b.record('blower/de', { overall: 3.1 });
    await b.pass(hourMs);
    const [mail] = server.to(ann) as [ParsedMail];
    const [picture] = mail.attachments;
    expect(picture).toMatchObject({ contentType: 'image/png', cid: 'trend-1@humledger.invalid' });
    expect(picture.related).toBe(true);
    expect(mail.html).toContain('Trend of overall, blower, de; its figures stand above.');
    expect(mail.text).not.toContain('trend-1');
    expect(picture.size).toBeLessThan(100_000);
  });

  it('begin a new thread when everything of the machine had returned to normal', async () => {
    const { server, bench: b } = await bench({ to: [{ address: ann }] });
    await b.record('blower/de', { overall: 3 });
    await b.pass(5 * minuteMs);
    await b.command(1, 'acknowledge');
    await b.record('blower/de', { overall: 1 });
    // No round in between: the end of the first story is seen in the ledger, not in memory.
    b.clock.advance(hourMs);
    await b.record('blower/nde', { overall: 3 });
    await b.pass(5 * minuteMs);
    const [first, second] = server.to(ann) as [ParsedMail, ParsedMail];
    expect(subjects([first, second])).toEqual([
      'ALERT 1: blower, de, overall 3 mm/s r.m.s.',
      'ALERT 2: blower, nde, overall 3 mm/s r.m.s.',
    ]);
    expect(references(second)).toEqual([]);
  });

  it('stay in one thread while anything of the machine stands, each alarm under a subject of its own', async () => {
    const { server, bench: b } = await bench({ to: [{ address: ann }] });
    for (const [index, path] of ['blower/de', 'blower/nde'].entries()) {
      await b.record(path, { overall: 3 + index });
      await b.pass(hourMs, 5 * minuteMs);
    }
    await b.look('overdue', true, { machineId: 'blower', pointId: 'de' });
    await b.pass(hourMs, 5 * minuteMs);
    const mails = server.to(ann);
    expect(subjects(mails)).toEqual([
      'ALERT 1: blower, de, overall 3 mm/s r.m.s.',
      'ALERT 2: blower, nde, overall 4 mm/s r.m.s.',
      'TROUBLE 3: blower, de: overdue',
    ]);
    expect(references(mails[2] as ParsedMail)).toEqual([mails[0]?.messageId, mails[1]?.messageId]);
    expect(mails[2]?.text).toContain('TROUBLE 3');
  });

  it('gather what happens to one machine within the gathering time, and nothing of another', async () => {
    const { server, bench: b } = await bench({
      tree: { blower: { de: ['overall'], nde: ['overall'] }, pump: { de: ['overall'] } },
      to: [{ address: ann }, { address: ben, machines: ['pump'] }],
    });
    await b.record('blower/de', { overall: 3 });
    await b.pass(2 * minuteMs);
    await b.record('blower/nde', { overall: 3.5 });
    await b.record('pump/de', { overall: 4 });
    await b.pass(8 * minuteMs, minuteMs);
    expect(subjects(server.to(ann))).toEqual([
      'ALERT 2: blower, nde, overall 3.5 mm/s r.m.s. (and 1 more)',
      'ALERT 3: pump, de, overall 4 mm/s r.m.s.',
    ]);
    expect(subjects(server.to(ben))).toEqual(['ALERT 3: pump, de, overall 4 mm/s r.m.s.']);
    expect(server.to(ben)[0]?.messageId).not.toBe(server.to(ann)[1]?.messageId);
  });

  it('go to whoever takes any of the severities that travel together', async () => {
    const { server, bench: b } = await bench({
      to: [
        { address: ann, severities: ['alert'] },
        { address: ben, severities: ['trouble'] },
      ],
    });
    await b.record('blower/de', { overall: 3 });
    await b.record('blower/nde', { overall: 6 });
    await b.pass(10_000);
    expect(server.to(ann).length).toBe(1);
    expect(server.to(ben).length).toBe(0);
  });

  it('tell a level that came late, although its alarm does not stand and has no number', async () => {
    const { server, bench: b } = await bench({ to: [{ address: ann }] });
    await b.record('blower/de', { overall: 1 });
    await b.record('blower/de', { overall: 3 }, { usedMs: b.clock.wallMs() - dayMs, late: true });
    await b.record('blower/de', { overall: 4 }, { usedMs: b.clock.wallMs() - dayMs + hourMs, late: true });
    await b.pass(5 * minuteMs);
    expect(subjects(server.to(ann))).toEqual(['ALERT: blower, de, overall 4 mm/s r.m.s.']);
    expect(server.to(ann)[0]?.text).toContain('Found in a recording that came late');
    expect(server.to(ann)[0]?.text).not.toContain('this is over');
    await b.pass(hourMs, 10 * minuteMs);
    expect(server.got.length).toBe(1);
  });
});

describe('a backlog', () => {
  it.each([true, false])(
    'of more than can be looked at in one go holds up no danger (it runs: %s)',
    async (runs) => {
      const { server, bench: b } = await bench({ to: [{ address: ann }] });
      b.backlogRuns = runs;
      await b.ledger.transact(async (writer) => {
        for (let kind = 0; kind < 600; kind++) {
          const look = { present: true, usedMs: b.clock.wallMs(), reason: {} };
          const change = await lookAtTrouble(writer, sourceTrouble('unassigned', `kind ${kind}`), look);
          if (change !== null) await saveAlarmChange(writer, change, b.context(true));
        }
      });
      await b.record('blower/de', { overall: 6 });
      await b.pass(10_000);
      expect(subjects(server.to(ann))).toEqual(['DANGER 601: blower, de, overall 6 mm/s r.m.s.']);
    },
  );

  it('mails what still stands, and tells what came and went in one mail for all machines', async () => {
    const { server, bench: b } = await bench({
      tree: { blower: { de: ['overall'] }, pump: { de: ['overall'] }, fan: { de: ['overall'] } },
      to: [{ address: ann }, { address: ben, machines: ['fan'] }],
    });
    b.backlogRuns = true;
    const old = (hours: number) => ({ usedMs: b.clock.wallMs() - hours * hourMs, fromBacklog: true });
    await b.record('blower/de', { overall: 3 }, old(40));
    await b.record('pump/de', { overall: 6 }, old(39));
    await b.record('blower/de', { overall: 1 }, old(38));
    await b.record('pump/de', { overall: 1 }, old(37));
    await b.record('fan/de', { overall: 5 }, old(36));
    await b.pass(10 * minuteMs, minuteMs);
    expect(server.got).toEqual([]);
    b.backlogRuns = false;
    await b.pass(10 * minuteMs, minuteMs);
    expect(subjects(server.to(ann)).sort()).toEqual([
      'DANGER 3: fan, de, overall 5 mm/s r.m.s.',
      'Larkfen Waterworks: catch-up: 2 alarms came and went',
    ]);
    expect(subjects(server.to(ben))).toEqual(['DANGER 3: fan, de, overall 5 mm/s r.m.s.']);
    const catchUp = server.to(ann).find(({ subject }) => subject?.includes('catch-up'));
    expect(catchUp?.text).toContain('4 recordings');
    expect(catchUp?.text).toContain('highest 6 mm/s r.m.s.');
    expect(catchUp?.text).toContain('after 2 h');
    await b.pass(dayMs, hourMs);
    expect(server.got.length).toBe(3);
  });
});

describe('flush', () => {
  it('sends at once what would still be gathered', async () => {
    const { server, bench: b } = await bench({ to: [{ address: ann }] });
    await b.record('blower/de', { overall: 3 });
    expect(await b.rounds.round()).toMatchObject({
      composed: 0,
      delivered: 0,
      waiting: 0,
      againInMs: 5 * minuteMs,
    });
    expect(await b.rounds.round(true)).toEqual({
      composed: 1,
      delivered: 1,
      failed: 0,
      waiting: 0,
      againInMs: null,
    });
    expect(server.got.length).toBe(1);
  });
});
