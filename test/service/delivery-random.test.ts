/**
 * Whatever the server answers, whenever the service is stopped and started: every event is told to everybody whose server
 * takes it, and a repeat carries the same Message-ID. Real ledger, real SMTP server, a clock that the test moves.
 */
import fc from 'fast-check';
import { sql } from 'kysely';
import { describe, expect, it } from 'vitest';
import { parseHours } from '../../src/config/hours.ts';
import { standing } from '../../src/detection/alarm-state.ts';
import type { StepName } from '../../src/service/steps.ts';
import { standingAlarms } from '../../src/store/alarms.ts';
import { newestSequence } from '../../src/store/journal.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { ann, ben, dayMs, hourMs, MailBench, minuteMs } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

const seed = 20261201;
/** More of them in the long run. */
const runs = process.env.HUMLEDGER_LONG === '1' ? 150 : 8;
const machines = ['blower', 'pump', 'fan'] as const;
const tree = Object.fromEntries(machines.map((machine) => [machine, { de: ['overall'] }]));
const crowd = Array.from({ length: 13 }, (_, index) => `pump-${index}`);

type Says = 'ok' | 450 | 421 | 550 | 'drop';
type Deed =
  | { readonly does: 'record'; readonly machine: (typeof machines)[number]; readonly level: number }
  | { readonly does: 'trouble'; readonly present: boolean }
  | {
      readonly does: 'says';
      readonly to: 'ann' | 'ben';
      readonly at: 'recipient' | 'data';
      readonly says: Says;
    }
  | { readonly does: 'pass'; readonly ms: number; readonly stopAt: StepName | null; readonly nth: number }
  | { readonly does: 'crowd'; readonly level: number }
  | { readonly does: 'acknowledge'; readonly nth: number }
  | { readonly does: 'nobody listens'; readonly machine: (typeof machines)[number]; readonly nth: number }
  | { readonly does: 'morning' }
  | { readonly does: 'restart' }
  | { readonly does: 'set back'; readonly ms: number };

const steps: StepName[] = [
  'delivery: message stored',
  'delivery: attempt begun',
  'delivery: answer received',
  'delivery: answer stored',
];
const ms = fc.constantFrom(1_000, 15_000, 5 * minuteMs, 7 * minuteMs, hourMs, 26 * hourMs);
const pass = fc.record({
  does: fc.constant('pass' as const),
  ms,
  stopAt: fc.option(fc.constantFrom(...steps), { freq: 3 }),
  nth: fc.integer({ min: 1, max: 4 }),
});
const deed: fc.Arbitrary<Deed> = fc.oneof(
  { weight: 6, arbitrary: pass },
  {
    weight: 4,
    arbitrary: fc.record({
      does: fc.constant('record' as const),
      machine: fc.constantFrom(...machines),
      level: fc.constantFrom(1, 3, 6),
    }),
  },
  {
    weight: 3,
    arbitrary: fc.record({
      does: fc.constant('says' as const),
      to: fc.constantFrom('ann' as const, 'ben' as const),
      at: fc.constantFrom('recipient' as const, 'data' as const),
      says: fc.constantFrom<Says>('ok', 450, 421, 550, 'drop'),
    }),
  },
  { weight: 1, arbitrary: fc.record({ does: fc.constant('trouble' as const), present: fc.boolean() }) },
  { weight: 1, arbitrary: fc.constant<Deed>({ does: 'morning' }) },
  { weight: 1, arbitrary: fc.constant<Deed>({ does: 'restart' }) },
  {
    weight: 1,
    arbitrary: fc.record({ does: fc.constant('set back' as const), ms: fc.constantFrom(hourMs, dayMs) }),
  },
);

/** What brings floods, reminders and their end. */
const busyDeed: fc.Arbitrary<Deed> = fc.oneof(
  { weight: 8, arbitrary: deed },
  {
    weight: 2,
    arbitrary: fc.record({ does: fc.constant('crowd' as const), level: fc.constantFrom(1, 3, 6) }),
  },
  {
    weight: 4,
    arbitrary: fc.record({ does: fc.constant('acknowledge' as const), nth: fc.nat(20) }),
  },
  {
    weight: 2,
    arbitrary: fc.record({
      does: fc.constant('nobody listens' as const),
      machine: fc.constantFrom(...machines),
      nth: fc.nat(2),
    }),
  },
);

class Stopped extends Error {}

interface Story {
  readonly bench: MailBench;
  readonly server: MailServerOnLoopback;
  /** Stops at which the server had answered and the ledger did not know. */
  stoppedUnstored: number;
  /** Acknowledgements: number, its row in the journal, mails that the server had by then. */
  readonly acknowledged: { readonly number: number; readonly sequence: number; readonly mails: number }[];
}

async function acknowledge({ bench: b, server, acknowledged }: Story, nth: number): Promise<void> {
  const lives = await b.ledger.read(standingAlarms);
  const waiting = lives.filter(({ alarm }) => standing(alarm.state).endsWith('unacknowledged'));
  const number = waiting[nth % Math.max(1, waiting.length)]?.life.number;
  if (number === undefined) return;
  await b.command(number, 'acknowledge');
  const sequence = await b.ledger.read(newestSequence);
  acknowledged.push({ number, sequence, mails: server.got.length });
}

/** A danger is told, its reminder waits for the server, and somebody acknowledges meanwhile. */
async function nobodyListens(story: Story, machine: string, nth: number): Promise<void> {
  const { bench: b, server } = story;
  for (const who of [ann, ben]) says(server, who, 'recipient', 'ok');
  await b.record(`${machine}/de`, { overall: 6 });
  await b.pass(minuteMs, 20_000);
  for (const who of [ann, ben]) says(server, who, 'recipient', 450);
  await b.pass(2 * hourMs, 30 * minuteMs);
  await acknowledge(story, nth);
  for (const who of [ann, ben]) says(server, who, 'recipient', 'ok');
}

async function act(story: Story, deed: Deed): Promise<void> {
  const { bench: b } = story;
  if (deed.does === 'record') await b.record(`${deed.machine}/de`, { overall: deed.level });
  else if (deed.does === 'trouble')
    await b.look('overdue', deed.present, { machineId: 'fan', pointId: 'de' });
  else if (deed.does === 'crowd')
    for (const pump of crowd) await b.record(`${pump}/de`, { overall: deed.level });
  else if (deed.does === 'acknowledge') await acknowledge(story, deed.nth);
  else if (deed.does === 'nobody listens') await nobodyListens(story, deed.machine, deed.nth);
  else if (deed.does === 'morning') await b.rounds.morning();
  else if (deed.does === 'restart') b.restart();
  else if (deed.does === 'set back') b.clock.setWall(b.clock.wallMs() - deed.ms);
  else if (deed.does === 'pass') await passOrStop(story, deed);
  else says(story.server, deed.to === 'ann' ? ann : ben, deed.at, deed.says);
}

async function passOrStop(story: Story, deed: Extract<Deed, { does: 'pass' }>): Promise<void> {
  const { bench: b } = story;
  let reached = 0;
  b.step = (name) => {
    if (name === deed.stopAt && ++reached === deed.nth) throw new Stopped(name);
  };
  b.clock.advance(deed.ms);
  try {
    await b.rounds.round();
  } catch (error) {
    if (!(error instanceof Stopped)) throw error;
    if (error.message === 'delivery: answer received') story.stoppedUnstored++;
    b.restart();
  }
  b.step = () => {};
}

const rules = new WeakMap<MailServerOnLoopback, Map<string, Says>>();

function says(server: MailServerOnLoopback, who: string, at: 'recipient' | 'data', what: Says): void {
  const known = rules.get(server) ?? new Map<string, Says>();
  rules.set(server, known.set(`${at} ${who}`, what));
  const answer = (place: string) => (recipient: string) => {
    const word = known.get(`${place} ${recipient}`) ?? 'ok';
    return word === 'ok' ? undefined : word;
  };
  server.atRecipient = answer('recipient');
  server.atData = answer('data');
}

interface DeliveryRow {
  readonly mail_id: string;
  readonly recipient: string;
  readonly state: string;
  readonly last_answer: string | null;
}

async function check({ bench: b, server, stoppedUnstored }: Story): Promise<void> {
  expect(await b.ledger.read((reader) => untoldEvents(reader, 10))).toEqual([]);
  const rows = await b.ledger.read((reader) =>
    sql<DeliveryRow>`select mail_id, recipient, state, last_answer from deliveries`.execute(reader as never),
  );
  const got = new Map<string, string[]>();
  for (const { mail, raw, recipient } of server.got) {
    const id = mail.messageId ?? '';
    got.set(id, [...(got.get(id) ?? []), raw]);
    expect(rows.rows.find((row) => row.mail_id === id)?.recipient).toBe(recipient);
  }
  let repeats = 0;
  for (const { mail_id, state, last_answer } of rows.rows) {
    const copies = got.get(mail_id) ?? [];
    expect(['accepted', 'failed', 'superseded']).toContain(state);
    if (state === 'accepted') expect(copies.length).toBeGreaterThan(0);
    if (state === 'failed') expect(last_answer).toMatch(/550/);
    expect(new Set(copies).size).toBeLessThanOrEqual(1);
    repeats += Math.max(0, copies.length - 1);
  }
  expect(repeats).toBeLessThanOrEqual(stoppedUnstored);
  // Each event stands in one message, and that has one mail a recipient.
  const twice = await b.ledger.read((reader) =>
    sql`select e.identity, d.recipient from to_tell e join deliveries d on d.message_id = e.message_id
      group by e.identity, d.recipient having count(distinct d.mail_id) > 1`.execute(reader as never),
  );
  expect(twice.rows).toEqual([]);
}

interface ReminderRow {
  readonly mail_id: string;
  readonly event: string;
  readonly number: number | null;
  readonly sequence: number;
}

/** Mails that tell of nothing but reminders do not leave after what they remind of was acknowledged. */
async function checkReminders({ bench: b, server, acknowledged }: Story): Promise<number> {
  const { rows } = await b.ledger.read((reader) =>
    sql<ReminderRow>`select d.mail_id, e.event, e.number, e.journal_sequence as sequence
      from deliveries d join to_tell e on e.message_id = d.message_id`.execute(reader as never),
  );
  let reminders = 0;
  for (const [index, { mail }] of server.got.entries()) {
    const events = rows.filter(({ mail_id }) => mail_id === mail.messageId);
    if (events.length === 0 || events.some(({ event }) => event !== 'reminded')) continue;
    reminders++;
    const needed = events.some(
      ({ number, sequence }) =>
        !acknowledged.some((one) => one.number === number && one.sequence > sequence && one.mails <= index),
    );
    expect(needed, `mail ${index}: ${mail.subject}`).toBe(true);
  }
  return reminders;
}

describe('the outbox', () => {
  it('keeps that through floods, reminders, nights and hours; no reminder leaves after its acknowledgement', async () => {
    const hours = (text: string) => {
      const parsed = parseHours(text);
      if (!parsed.ok) throw new Error(parsed.what);
      return parsed.value;
    };
    const seen = { floods: 0, reminders: 0, stops: 0 };
    await fc.assert(
      fc.asyncProperty(
        fc.array(busyDeed, { minLength: 10, maxLength: 30 }),
        fc.boolean(),
        async (deeds, holds) => {
          const server = await MailServerOnLoopback.start();
          const b = await MailBench.start({
            tree: { ...tree, ...Object.fromEntries(crowd.map((pump) => [pump, { de: ['overall'] }])) },
            port: server.port,
            to: [{ address: ann }, { address: ben, hours: hours('mon..fri 06:00..18:00') }],
            mail: {
              reminders: { thenTo: ['cat@larkfen.example'], thenAfter: { ms: 3 * hourMs } },
              holdDuring: holds ? hours('22:00..06:00') : null,
            },
          });
          const story: Story = { server, bench: b, stoppedUnstored: 0, acknowledged: [] };
          for (const one of deeds) await act(story, one);
          // One that stays, so that there is something to remind of.
          await b.record('fan/de', { overall: 9 });
          for (const who of [ann, ben])
            for (const at of ['recipient', 'data'] as const) says(server, who, at, 'ok');
          // Until everybody has had his hours; a flood of reminders may be under way at any of them.
          for (let n = 0; n < 40; n++) {
            await b.pass(2 * hourMs);
            if (n >= 15 && (await b.ledger.read((reader) => untoldEvents(reader, 1))).length === 0) break;
          }
          await check(story);
          seen.reminders += await checkReminders(story);
          seen.floods += server.got.filter(({ mail }) => mail.subject?.includes('alarm flood')).length;
          seen.stops += story.stoppedUnstored;
          await server.stop();
        },
      ),
      { seed, numRuns: Math.ceil(runs / 2) },
    );
    // Stops by themselves are seen to in the next test.
    expect(seen, JSON.stringify(seen)).toMatchObject({
      floods: expect.toSatisfy((count: number) => count > 0),
      reminders: expect.toSatisfy((count: number) => count > 0),
    });
  }, 3_600_000);

  it('tells everything once to whoever takes it, through random answers, stops, starts and clocks', async () => {
    let mails = 0;
    let stops = 0;
    await fc.assert(
      fc.asyncProperty(fc.array(deed, { minLength: 8, maxLength: 30 }), async (deeds) => {
        const server = await MailServerOnLoopback.start();
        const to = [{ address: ann }, { address: ben }];
        const story: Story = {
          server,
          bench: await MailBench.start({ tree, port: server.port, to }),
          stoppedUnstored: 0,
          acknowledged: [],
        };
        for (const one of deeds) await act(story, one);
        says(server, ann, 'recipient', 'ok');
        for (const who of [ann, ben])
          for (const at of ['recipient', 'data'] as const) says(server, who, at, 'ok');
        await story.bench.pass(4 * hourMs, 5 * minuteMs);
        await check(story);
        mails += server.got.length;
        stops += story.stoppedUnstored;
        await server.stop();
      }),
      { seed, numRuns: runs },
    );
    expect(mails).toBeGreaterThan(2 * runs);
    expect(stops).toBeGreaterThan(0);
  }, 3_600_000);

  it('outlasts a server that puts every newcomer off and takes him after a quarter of an hour', async () => {
    const server = await MailServerOnLoopback.start();
    const b = await MailBench.start({ tree, port: server.port, to: [{ address: ann }, { address: ben }] });
    const first = new Map<string, number>();
    server.atRecipient = (recipient) => {
      const since = first.get(recipient) ?? b.clock.wallMs();
      first.set(recipient, since);
      return b.clock.wallMs() - since < 15 * minuteMs ? 451 : undefined;
    };
    await b.record('blower/de', { overall: 3 });
    const begunMs = b.clock.wallMs();
    let tookMs = 0;
    for (let n = 0; n < 120 && server.got.length < 2; n++) {
      await b.pass(30_000);
      tookMs = b.clock.wallMs() - begunMs;
    }
    expect(server.got.map(({ recipient }) => recipient).sort()).toEqual([ann, ben]);
    expect(tookMs).toBeLessThan(45 * minuteMs);
    await b.pass(dayMs, hourMs);
    expect(server.got.length).toBe(2);
  });

  it('lets a danger overtake the other mails of a slow round', async () => {
    const many = Object.fromEntries(Array.from({ length: 8 }, (_, n) => [`fan-${n}`, { de: ['overall'] }]));
    const server = await MailServerOnLoopback.start();
    const b = await MailBench.start({
      tree: { ...many, pump: { de: ['overall'] } },
      port: server.port,
      to: [{ address: ann }],
    });
    for (const machine of Object.keys(many)) await b.record(`${machine}/de`, { overall: 3 });
    const recorded: Promise<void>[] = [];
    let stored = 0;
    b.step = (name) => {
      if (name !== 'delivery: answer stored') return;
      stored++;
      if (stored === 2) recorded.push(b.record('pump/de', { overall: 6 }));
      if (stored === 3) b.clock.advance(10_000);
    };
    b.clock.advance(5 * minuteMs);
    await b.rounds.round();
    await Promise.all(recorded);
    const subjects = server.to(ann).map(({ subject }) => subject?.split(' ')[0]);
    expect(subjects).toHaveLength(9);
    expect(subjects.indexOf('DANGER')).toBeLessThanOrEqual(4);
  });
});
