/**
 * What becomes of a mail whatever the server does: real ledger, real SMTP server on loopback, a clock that the test moves.
 */
import { chmodSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { describe, expect, it, onTestFinished } from 'vitest';
import type { MailServer } from '../../src/config/site.ts';
import { type StepName, stepNames } from '../../src/service/steps.ts';
import { deliveriesOf } from '../../src/store/deliveries.ts';
import { readJournal } from '../../src/store/journal.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { outboxCounts } from '../../src/store/threads.ts';
import { temporaryFolder } from '../store/temporary-ledger.ts';
import { ann, type BenchOptions, ben, dayMs, hourMs, MailBench, minuteMs } from './mail-bench.ts';
import { closedPort, loopbackCertificate, MailServerOnLoopback, withTls } from './mail-server.ts';

async function bench(options: BenchOptions = {}, server?: MailServerOnLoopback) {
  const on = server ?? (await MailServerOnLoopback.start());
  return { server: on, bench: await MailBench.start({ port: on.port, to: [{ address: ann }], ...options }) };
}

const counts = async (b: MailBench) => (await b.ledger.read(outboxCounts)).deliveries;
const lastAnswer = async (b: MailBench) => (await b.ledger.read(outboxCounts)).lastAnswer?.answer ?? '';
const starttls = (port: number, more: Partial<MailServer> = {}): MailServer => ({
  host: '127.0.0.1',
  port,
  security: 'starttls',
  user: null,
  passwordFile: null,
  ...more,
});
function passwordFile(mode: number): string {
  const file = join(temporaryFolder(), 'mail-password');
  writeFileSync(file, 'open sesame 42\n');
  chmodSync(file, mode);
  return file;
}

describe('a mail', () => {
  it('that is put off is kept, tried again after growing pauses, and arrives once', async () => {
    const { server, bench: b } = await bench();
    server.atData = () => 451;
    await b.record('blower/de', { overall: 3 });
    await b.pass(5 * minuteMs);
    const tries = async () => {
      const rows = await b.ledger.read((reader) => deliveriesOf(reader, 1));
      return rows.map(({ tries: count, state }) => [count, state]);
    };
    expect(await tries()).toEqual([[1, 'waiting']]);
    expect(await lastAnswer(b)).toContain('451');
    // After 60 s, then at twice the age each time: 1, 2, 4, 8, 16, 32 minutes.
    await b.pass(40 * minuteMs, 30_000);
    expect(await tries()).toEqual([[7, 'waiting']]);
    server.atData = () => undefined;
    await b.pass(2 * hourMs, minuteMs);
    expect(await tries()).toEqual([[8, 'accepted']]);
    expect(server.got.length).toBe(1);
  });

  it('refused for one of two recipients reaches the other, and the refusal is told, journalled and no loop', async () => {
    const { server, bench: b } = await bench({ to: [{ address: ann }, { address: ben }] });
    server.atRecipient = (recipient) => (recipient === ben ? 550 : undefined);
    await b.record('blower/de', { overall: 3 });
    await b.pass(5 * minuteMs);
    expect(server.to(ann).length).toBe(1);
    expect(await counts(b)).toMatchObject({ accepted: 1, failed: 1, waiting: 0 });
    await b.pass(dayMs, 5 * minuteMs);
    const told = server.to(ann);
    expect(told.length).toBe(2);
    expect(told[1]?.subject).toContain('TROUBLE 2');
    expect(told[1]?.text).toContain(ben);
    expect(told[1]?.text).toContain('550');
    const journal = await b.ledger.read((reader) => readJournal(reader, { limit: 50 }));
    expect(journal.filter(({ event }) => event === 'note').map(({ reason }) => reason.recipient)).toEqual([
      ben,
      ben,
    ]);
    expect(b.logged.filter((line) => line.includes('"level":"error"')).length).toBe(2);
    // It is over only when that recipient takes mail again.
    server.atRecipient = () => undefined;
    await b.record('blower/nde', { overall: 3 });
    await b.pass(hourMs, 5 * minuteMs);
    // Told of what is new, then of what he never heard of and still stands.
    expect(server.to(ben).map(({ text }) => /blower, n?de/.exec(text ?? '')?.[0])).toEqual([
      'blower, nde',
      'blower, de',
    ]);
    const after = await b.ledger.read((reader) => readJournal(reader, { limit: 1 }));
    expect(after[0]).toMatchObject({ event: 'returned', key: 'trouble:mail-refused:site' });
  });

  it('refused over a weekend is sent when the server takes mail again, if what it tells of still stands', async () => {
    const tree = { blower: { de: ['overall'] }, pump: { de: ['overall'] }, fan: { de: ['overall'] } };
    const { server, bench: b } = await bench({ tree });
    server.atData = () => 554;
    await b.record('blower/de', { overall: 6 });
    await b.record('pump/de', { overall: 6 });
    await b.pass(hourMs, 5 * minuteMs);
    const refused = await b.ledger.read((reader) => deliveriesOf(reader, 1));
    await b.pass(2 * dayMs, 30 * minuteMs);
    await b.record('pump/de', { overall: 1 });
    await b.command(2, 'acknowledge');
    expect(server.got).toEqual([]);
    server.atData = () => undefined;
    await b.record('fan/de', { overall: 6 });
    await b.pass(hourMs, 5 * minuteMs);
    expect(server.to(ann).map(({ subject }) => subject)).toEqual([
      'DANGER 4: fan, de, overall 6 mm/s r.m.s.',
      'DANGER 1: blower, de, overall 6 mm/s r.m.s.',
    ]);
    expect(server.to(ann)[1]?.messageId).toBe(refused[0]?.mailId);
    expect(await counts(b)).toMatchObject({ waiting: 0 });
  });

  it('refused for one who takes mail again reaches him, though another is refused for good', async () => {
    const { server, bench: b } = await bench({ to: [{ address: ann }, { address: ben }] });
    const about = ({ text }: { text?: string | undefined }) => /blower, n?de/.exec(text ?? '')?.[0];
    server.atRecipient = () => 550;
    await b.record('blower/de', { overall: 6 });
    await b.pass(hourMs, 5 * minuteMs);
    server.atRecipient = (recipient) => (recipient === ann ? 550 : undefined);
    await b.record('blower/nde', { overall: 6 });
    await b.pass(dayMs, 5 * minuteMs);
    const to = server.to(ben).map(about);
    expect(to.filter((text) => text === 'blower, nde')).toHaveLength(1);
    expect(to.filter((text) => text === 'blower, de')).toHaveLength(1);
    expect(server.to(ann)).toEqual([]);
    expect(await counts(b)).toMatchObject({ waiting: 0 });
    const journal = await b.ledger.read((reader) => readJournal(reader, { limit: 50 }));
    const events = journal.filter(({ key }) => key === 'trouble:mail-refused:site').map(({ event }) => event);
    expect(events).toContain('raised');
    expect(events).not.toContain('returned');
  });

  it('refused for what is in it goes out three times, however often other mails are taken', async () => {
    const { server, bench: b } = await bench();
    let refusals = 0;
    server.atData = () => {
      if (server.got.length < refusals) return undefined;
      refusals++;
      return 554;
    };
    await b.record('blower/de', { overall: 6 });
    await b.pass(dayMs, 5 * minuteMs);
    const tries = await b.ledger.read((reader) => deliveriesOf(reader, 1));
    expect(tries.map(({ state, tries: count }) => [state, count])).toEqual([['failed', 3]]);
    expect(server.got.length).toBe(3);
    expect(await counts(b)).toMatchObject({ waiting: 0 });
  });

  it('that all servers refuse for good is not tried again', async () => {
    const { server, bench: b } = await bench();
    server.atData = () => 554;
    await b.record('blower/de', { overall: 3 });
    await b.pass(dayMs, 10 * minuteMs);
    expect(await counts(b)).toEqual({ waiting: 0, accepted: 0, failed: 2, superseded: 0 });
    expect((await b.rounds.round()).againInMs).toBe(null);
  });

  it('whose connection drops during the data arrives later with the same Message-ID, and holds up no other', async () => {
    const { server, bench: b } = await bench({ to: [{ address: ann }, { address: ben }] });
    server.atData = (recipient) => (recipient === ann ? 'drop' : undefined);
    await b.record('blower/de', { overall: 6 });
    await b.pass(hourMs, 10_000);
    expect(server.to(ben).length).toBe(1);
    expect(await counts(b)).toMatchObject({ accepted: 1, waiting: 1 });
    const [stored] = await b.ledger.read((reader) => deliveriesOf(reader, 1));
    server.atData = () => undefined;
    await b.pass(hourMs, 10_000);
    expect(server.to(ann).map(({ messageId }) => messageId)).toEqual([stored?.mailId]);
  });

  it('to a server that falls silent waits, and the round ends', async () => {
    const { server, bench: b } = await bench({ mailer: { idleTimeoutMs: 150 } });
    server.atData = () => 'stall';
    await b.record('blower/de', { overall: 6 });
    await b.pass(10_000);
    expect(await counts(b)).toMatchObject({ waiting: 1 });
    expect(await lastAnswer(b)).toMatch(/timeout/i);
    server.atData = () => undefined;
    await b.pass(15_000);
    expect(server.got.length).toBe(1);
  });

  it('leaves through the second server, the same bytes, where the first does not take it', async () => {
    const second = await MailServerOnLoopback.start();
    const { server, bench: b } = await bench({
      mail: { secondServer: starttls(second.port, { security: 'none' }) },
    });
    server.atData = () => 554;
    await b.record('blower/de', { overall: 6 });
    await b.pass(10_000);
    expect(server.got.length).toBe(0);
    expect(second.got.length).toBe(1);
    const [stored] = await b.ledger.read((reader) => deliveriesOf(reader, 1));
    expect(stored?.state).toBe('accepted');
    expect(second.got[0]?.raw.trimEnd()).toBe(
      Buffer.from(stored?.bytes ?? [])
        .toString()
        .trimEnd(),
    );
    await server.stop();
    await b.record('blower/nde', { overall: 6 });
    await b.pass(10_000);
    expect(second.got.length).toBe(2);
    await second.stop();
    await b.record('blower/nde', { overall: 1 });
    await b.record('blower/nde', { overall: 7 });
    await b.pass(10_000);
    expect(await lastAnswer(b)).toMatch(/ECONNREFUSED.*second server.*ECONNREFUSED/);
  });
});

describe('transport security', () => {
  it('a certificate that cannot be trusted: not sent, not lost, and the answer says so', async () => {
    const server = await MailServerOnLoopback.start(withTls);
    const { bench: b } = await bench({ mail: { server: starttls(server.port) } }, server);
    await b.record('blower/de', { overall: 6 });
    await b.pass(10_000);
    expect(server.got).toEqual([]);
    expect(await counts(b)).toMatchObject({ waiting: 1 });
    expect(await lastAnswer(b)).toMatch(/certificate/i);
  });

  it('a certificate that is trusted: sent, with the password, over TLS only', async () => {
    const server = await MailServerOnLoopback.start(withTls);
    const login = { user: 'humledger', passwordFile: passwordFile(0o600) };
    const { bench: b } = await bench(
      {
        mail: { server: starttls(server.port, login) },
        mailer: { extraCertificates: [loopbackCertificate] },
      },
      server,
    );
    await b.record('blower/de', { overall: 6 });
    await b.pass(10_000);
    expect(server.got.length).toBe(1);
    expect(server.passwords).toEqual(['open sesame 42']);
    expect(b.logged.join()).not.toContain('sesame');
  });

  it.each(['starttls', 'none'] as const)(
    'a server that offers a login but no TLS never sees the password (%s)',
    async (security) => {
      const server = await MailServerOnLoopback.start({ allowInsecureAuth: true });
      const login = { security, user: 'humledger', passwordFile: passwordFile(0o600) };
      const { bench: b } = await bench({ mail: { server: starttls(server.port, login) } }, server);
      await b.record('blower/de', { overall: 6 });
      await b.pass(hourMs, 5 * minuteMs);
      expect(server.passwords).toEqual([]);
      expect(server.got).toEqual([]);
      expect(await counts(b)).toMatchObject({ waiting: 1, failed: 0 });
      expect(await lastAnswer(b)).toMatch(/TLS/);
    },
  );

  it('a password file that others can read is refused and named, and its content told to nobody', async () => {
    const server = await MailServerOnLoopback.start(withTls);
    const file = passwordFile(0o644);
    const login = { user: 'humledger', passwordFile: file };
    const { bench: b } = await bench({ mail: { server: starttls(server.port, login) } }, server);
    await b.record('blower/de', { overall: 6 });
    await b.pass(10_000);
    expect(server.connections).toBe(0);
    expect(await lastAnswer(b)).toBe(`password file ${file} can be read by others: chmod 600 it`);
    expect(b.logged.join()).toContain(file);
    expect(b.logged.join()).not.toContain('sesame');
  });
});

describe('a server that is down', () => {
  it('for three days: everything is told when it is back, of summaries only the newest', async () => {
    const server = await MailServerOnLoopback.start();
    await server.stop();
    const { bench: b } = await bench(
      { tree: { blower: { de: ['overall'] }, pump: { de: ['overall'] }, fan: { de: ['overall'] } } },
      server,
    );
    await b.record('blower/de', { overall: 3 });
    await b.pass(hourMs, minuteMs);
    await b.record('pump/de', { overall: 3 });
    await b.pass(hourMs, minuteMs);
    await b.record('pump/de', { overall: 1 });
    await b.record('fan/de', { overall: 6 });
    const dates: (string | null)[] = [];
    for (let hour = 0; hour < 70; hour++) {
      await b.pass(hourMs, 5 * minuteMs);
      const date = await b.rounds.morning();
      if (date !== null) dates.push(date);
    }
    expect(dates).toEqual(['2026-12-02', '2026-12-03', '2026-12-04']);
    expect(await counts(b)).toMatchObject({ superseded: 2, accepted: 0, failed: 0 });
    await server.start();
    await b.pass(20 * minuteMs, 10_000);
    expect(
      server
        .to(ann)
        .map(({ subject }) => subject)
        .sort(),
    ).toEqual([
      'ALERT 1: blower, de, overall 3 mm/s r.m.s.',
      'DANGER 3: fan, de, overall 6 mm/s r.m.s.',
      'Larkfen Waterworks, Fri 4 Dec 2026: 3 machines need a person today',
      'Larkfen Waterworks: catch-up: 1 alarm came and went',
    ]);
    expect(await b.ledger.read((reader) => untoldEvents(reader, 10))).toEqual([]);
    expect(await counts(b)).toMatchObject({ waiting: 0 });
    expect((await b.rounds.round()).againInMs).toBe(null);
  });

  it('is asked once a round, not once for every mail that waits', async () => {
    const machines = Object.fromEntries(
      Array.from({ length: 10 }, (_, index) => [`fan-${index}`, { de: ['overall'] }]),
    );
    const server = await MailServerOnLoopback.start({ onConnect: undefined });
    const { bench: b } = await bench({ tree: machines }, server);
    server.atRecipient = () => 421;
    for (const machine of Object.keys(machines)) await b.record(`${machine}/de`, { overall: 6 });
    await b.pass(10_000);
    expect(server.connections).toBe(1);
    await b.pass(14_000, 1_000);
    expect(server.connections).toBe(1);
    await b.pass(10 * minuteMs, 1_000);
    expect(server.connections).toBeLessThan(45);
    server.atRecipient = () => undefined;
    await b.pass(5 * minuteMs, 1_000);
    expect(server.got.length).toBe(10);
  });

  it('does not keep a new danger waiting for the pause of the others', async () => {
    const port = await closedPort();
    const tree = { blower: { de: ['overall'] }, pump: { de: ['overall'] } };
    const { server, bench: b } = await bench({ tree, port });
    await b.record('blower/de', { overall: 3 });
    await b.pass(5 * minuteMs);
    await b.pass(2 * hourMs, minuteMs);
    server.port = port;
    await server.stop();
    await server.start();
    await b.record('pump/de', { overall: 6 });
    await b.pass(11_000, 1_000);
    expect(server.to(ann)[0]?.subject).toContain('DANGER 2');
    await b.pass(1_000);
    expect(server.to(ann).length).toBe(2);
  });

  it('and a wall clock that was set back: nothing waits for the old time', async () => {
    const { server, bench: b } = await bench();
    server.atData = () => 451;
    await b.record('blower/de', { overall: 6 });
    await b.pass(10_000);
    b.clock.setWall(b.clock.wallMs() - 30 * dayMs);
    server.atData = () => undefined;
    await b.pass(1_000);
    expect(server.got.length).toBe(1);
    await b.record('blower/nde', { overall: 6 }, { usedMs: b.clock.wallMs() + 31 * dayMs });
    await b.pass(11_000, 1_000);
    expect(server.got.length).toBe(2);
  });
});

describe('a stop between any two steps', () => {
  const steps = stepNames.filter((name) => name.startsWith('delivery:'));
  it.each(steps.flatMap((name) => [1, 2].map((nth) => [name, nth] as const)))(
    'at %s, the time %i: every event is told, a repeat has the same Message-ID',
    async (name, nth) => {
      const { server, bench: b } = await bench({ to: [{ address: ann }, { address: ben }] });
      let seen = 0;
      b.step = (at: StepName) => {
        if (at === name && ++seen === nth) throw new Error(`stopped at ${at}`);
      };
      await b.record('blower/de', { overall: 6 });
      await b.look('overdue', true);
      b.clock.advance(5 * minuteMs);
      await expect(b.rounds.round()).rejects.toThrow('stopped at');
      b.step = () => {};
      b.restart();
      await b.pass(10 * minuteMs, 10_000);
      for (const recipient of [ann, ben]) {
        const ids = server.to(recipient).map(({ messageId }) => messageId);
        expect(new Set(ids).size).toBe(2);
        expect(ids.length).toBeLessThanOrEqual(3);
      }
      expect(await b.ledger.read((reader) => untoldEvents(reader, 10))).toEqual([]);
      expect(await counts(b)).toEqual({ waiting: 0, accepted: 4, failed: 0, superseded: 0 });
    },
  );
});

describe('a ledger that cannot be written', () => {
  it('after the server has taken a mail does not send it again, and is said once', async () => {
    const folder = temporaryFolder();
    const server = await MailServerOnLoopback.start();
    const b = await MailBench.start({ port: server.port, to: [{ address: ann }] }, folder);
    await b.record('blower/de', { overall: 6 });
    const other = new Database(b.ledger.path);
    onTestFinished(() => {
      other.close();
    });
    b.step = (name) => {
      if (name === 'delivery: answer received') other.exec('begin immediate');
    };
    b.clock.advance(10_000);
    expect(await b.rounds.round()).toMatchObject({ delivered: 0, waiting: 1, againInMs: 5_000 });
    b.step = () => {};
    expect(await b.rounds.round()).toMatchObject({ delivered: 0, waiting: 1 });
    expect(server.got.length).toBe(1);
    expect(b.logged.filter((line) => line.includes('locked by somebody else')).length).toBe(1);
    other.exec('rollback');
    expect(await b.rounds.round()).toMatchObject({ waiting: 0, againInMs: null });
    expect(server.got.length).toBe(1);
    expect(await counts(b)).toMatchObject({ accepted: 1, waiting: 0 });
  });
});

it('rounds asked for at the same time are one', async () => {
  const { server, bench: b } = await bench();
  await b.record('blower/de', { overall: 6 });
  b.clock.advance(10_000);
  const rounds = await Promise.all([b.rounds.round(), b.rounds.round(), b.rounds.round()]);
  expect(rounds.map(({ delivered }) => delivered)).toEqual([1, 1, 1]);
  expect(server.got.length).toBe(1);
});
