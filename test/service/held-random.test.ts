/**
 * Whatever people do to alarms and places while levels come and go: with the real ledger, outbox and SMTP server no event
 * goes out under two Message-IDs, and no danger that stands unacknowledged is lost.
 */
import fc from 'fast-check';
import { sql } from 'kysely';
import { expect, it } from 'vitest';
import { standing } from '../../src/detection/alarm-state.ts';
import { actOnAlarm } from '../../src/service/acts-log.ts';
import { putInService, takeOutOfService } from '../../src/service/place-service.ts';
import { watchSuppressions } from '../../src/service/watch-suppressions.ts';
import { loadAllAlarms, standingAlarms } from '../../src/store/alarms.ts';
import { readJournal } from '../../src/store/journal.ts';
import { untoldEvents } from '../../src/store/messages.ts';
import { ann, dayMs, hourMs, MailBench, minuteMs } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

const seed = 20261201;
const runs = process.env.HUMLEDGER_LONG === '1' ? 150 : 10;

type Deed =
  | { readonly does: 'record'; readonly at: 'blower' | 'pump'; readonly levels: readonly number[] }
  | {
      readonly does: 'act';
      readonly kind: 'acknowledge' | 'reset' | 'unshelve' | 'shelve';
      readonly nth: number;
      readonly hours: number;
    }
  | { readonly does: 'out'; readonly place: 'machine' | 'point'; readonly hours: number }
  | { readonly does: 'in'; readonly place: 'machine' | 'point'; readonly hours: number }
  | { readonly does: 'trouble'; readonly present: boolean }
  | { readonly does: 'pass'; readonly ms: number }
  | { readonly does: 'restart' };

const hours = fc.constantFrom(1, 3, 30);
const deed: fc.Arbitrary<Deed> = fc.oneof(
  {
    weight: 6,
    arbitrary: fc.record({
      does: fc.constant('record' as const),
      at: fc.constantFrom('blower' as const, 'pump' as const),
      levels: fc.array(fc.constantFrom(1, 3, 6), { minLength: 1, maxLength: 4 }),
    }),
  },
  {
    weight: 5,
    arbitrary: fc.record({
      does: fc.constant('act' as const),
      kind: fc.constantFrom('acknowledge' as const, 'reset' as const, 'unshelve' as const, 'shelve' as const),
      nth: fc.integer({ min: 0, max: 3 }),
      hours,
    }),
  },
  {
    weight: 2,
    arbitrary: fc.record({
      does: fc.constantFrom('out' as const, 'in' as const),
      place: fc.constantFrom('machine' as const, 'point' as const),
      hours,
    }),
  },
  { weight: 1, arbitrary: fc.record({ does: fc.constant('trouble' as const), present: fc.boolean() }) },
  {
    weight: 4,
    arbitrary: fc.record({
      does: fc.constant('pass' as const),
      ms: fc.constantFrom(15_000, 10 * minuteMs, 2 * hourMs, dayMs),
    }),
  },
  { weight: 1, arbitrary: fc.constant<Deed>({ does: 'restart' }) },
);

const person = (b: MailBench) =>
  ({ by: 'K. Example', comment: 'why', via: 'command', wallMs: b.clock.wallMs() }) as const;

async function act(b: MailBench, one: Deed): Promise<void> {
  if (one.does === 'record') {
    for (const level of one.levels) {
      await b.record(`${one.at}/de`, { overall: level });
      await watchSuppressions(b.ledger, b.view, b.clock.wallMs());
      b.clock.advance(hourMs);
    }
  } else if (one.does === 'act') {
    const lives = (await b.ledger.read(loadAllAlarms)).filter(({ number }) => number !== null);
    const number = lives[one.nth % Math.max(1, lives.length)]?.number ?? 1;
    const shelf = { kind: 'shelve', comment: 'why', forMs: one.hours * hourMs, atMostMs: 7 * dayMs } as const;
    const order = one.kind === 'shelve' ? shelf : { kind: one.kind, comment: null };
    await actOnAlarm(b.ledger, number, order, person(b));
  } else if (one.does === 'out' || one.does === 'in') {
    const machine = b.view.machine('blower');
    const place = { machine, point: one.place === 'point' ? (machine.points[0] ?? null) : null };
    const untilMs = b.clock.wallMs() + one.hours * hourMs;
    if (one.does === 'out') await takeOutOfService(b.ledger, place, untilMs, person(b));
    else await putInService(b.ledger, place, { newBaseline: false }, person(b));
  } else if (one.does === 'trouble') {
    await b.look('dead-sensor', one.present, { machineId: 'fan', pointId: 'de' });
    await watchSuppressions(b.ledger, b.view, b.clock.wallMs());
  } else if (one.does === 'restart') b.restart();
  else {
    b.clock.advance(one.ms);
    await watchSuppressions(b.ledger, b.view, b.clock.wallMs());
    await b.rounds.round();
  }
}

/** What no story may end with, after everything that holds back has ended. */
async function check(b: MailBench, server: MailServerOnLoopback): Promise<number> {
  expect(await b.ledger.read((reader) => untoldEvents(reader, 10))).toEqual([]);
  const twice = await b.ledger.read((reader) =>
    sql`select e.identity from to_tell e join deliveries d on d.message_id = e.message_id
      group by e.identity, d.recipient having count(distinct d.mail_id) > 1`.execute(reader as never),
  );
  expect(twice.rows).toEqual([]);
  const ids = server.got.map(({ mail }) => mail.messageId);
  expect(new Set(ids).size).toBe(ids.length);
  let dangers = 0;
  for (const { alarm, life } of await b.ledger.read(standingAlarms)) {
    const { state } = alarm;
    expect(state.suppressions.filter((one) => one !== 'by-design')).toEqual([]);
    if (state.condition !== 'danger') continue;
    dangers++;
    expect(['unacknowledged', 'acknowledged']).toContain(standing(state));
    const told = await b.ledger.read((reader) =>
      sql<{ number: number }>`select number from to_tell where number = ${life.number} and severity = 'danger'
        and message_id is not null`.execute(reader as never),
    );
    expect(told.rows.length).toBeGreaterThan(0);
    const acknowledged = (
      await b.ledger.read((reader) => readJournal(reader, { number: life.number, limit: 500 }))
    ).some(({ event }) => event === 'acknowledged');
    if (!acknowledged) expect(standing(state)).toBe('unacknowledged');
  }
  return dangers;
}

it('no event goes out under two Message-IDs, and no danger is lost, whatever people do', async () => {
  let dangers = 0;
  let held = 0;
  await fc.assert(
    fc.asyncProperty(
      fc.array(deed, { minLength: 8, maxLength: 30 }),
      fc.boolean(),
      async (deeds, latching) => {
        const server = await MailServerOnLoopback.start();
        const b = await MailBench.start({
          tree: { blower: { de: ['overall'] }, pump: { de: ['overall'] }, fan: { de: ['overall'] } },
          port: server.port,
          to: [{ address: ann }],
          limit: { latching, suppressedWhile: [{ by: 'trouble', machineId: 'fan', pointId: 'de' }] },
        });
        for (const one of deeds) await act(b, one);
        // Every story ends with dangers, under whatever holds them back by then.
        for (const at of ['blower', 'pump'] as const) await act(b, { does: 'record', at, levels: [6] });
        await b.look('dead-sensor', false, { machineId: 'fan', pointId: 'de' });
        b.clock.advance(31 * hourMs);
        await watchSuppressions(b.ledger, b.view, b.clock.wallMs());
        await b.pass(hourMs, 10 * minuteMs);
        dangers += await check(b, server);
        const rows = await b.ledger.read((reader) => readJournal(reader, { limit: 1000 }));
        held += rows.filter(({ event }) => /^(shelf-expired|in-service|unsuppressed)$/.test(event)).length;
        await server.stop();
        await b.ledger.close();
      },
    ),
    { seed, numRuns: runs },
  );
  expect(dangers).toBe(2 * runs);
  expect(held).toBeGreaterThan(runs);
}, 600_000);
