import { expect, test } from 'vitest';
import { deliveriesOf, dueDeliveries, storeAnswer } from '../../src/store/deliveries.ts';
import { appendJournal, appendTelling } from '../../src/store/journal.ts';
import type { Ledger } from '../../src/store/ledger.ts';
import {
  eventsOfMessage,
  insertMessage,
  messageByIdentity,
  type NewMessage,
  supersedeOlder,
  untoldEvents,
} from '../../src/store/messages.ts';
import { syncSite } from '../../src/store/site-ids.ts';
import { keepSummary, readSummary } from '../../src/store/summaries.ts';
import {
  changeThread,
  closeThread,
  mailIdsOfThread,
  openThread,
  openThreadOf,
  outboxCounts,
} from '../../src/store/threads.ts';
import { smallSite } from './small-site.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

async function withEvents(count: number): Promise<Ledger> {
  const ledger = await opened(temporaryFolder());
  const { site, text } = smallSite({ pump: { de: ['low'] } });
  await ledger.transact(async (writer) => {
    await syncSite(writer, site, { text, wallMs: 1 });
    for (let index = 0; index < count; index++) {
      const journalSequence = await appendJournal(writer, {
        key: null,
        number: null,
        event: 'started',
        before: null,
        after: null,
        usedMs: null,
        wallMs: index,
        recordingId: null,
        configVersionId: null,
        actor: 'service',
        via: 'service',
        comment: null,
        reason: {},
      });
      await appendTelling(writer, {
        journalSequence,
        key: null,
        number: null,
        machineId: index % 2 === 0 ? 1 : null,
        severity: 'trouble',
        event: 'started',
        level: null,
        identity: `event ${index}`,
        wallMs: index,
        fromBacklog: index === 1,
      });
    }
  });
  return ledger;
}

function message(identity: string, more: Partial<NewMessage> = {}): NewMessage {
  return {
    kind: 'alarm',
    identity,
    priority: 1,
    groupKey: 'pump',
    threadId: null,
    subject: 'danger 1',
    createdMs: 100,
    notBeforeMs: 0,
    tells: [],
    deliveries: ['b@larkfen.example', 'a@larkfen.example'].map((recipient) => ({
      recipient,
      mailId: `<${identity}.${recipient}>`,
      bytes: Buffer.from(`mail ${identity} to ${recipient}`),
      dueMs: 100,
    })),
    ...more,
  };
}

const insert = (ledger: Ledger, what: NewMessage) => ledger.transact((writer) => insertMessage(writer, what));

test('an event is told by one message, once, whoever composes it again', async () => {
  const ledger = await withEvents(3);
  const events = await ledger.read((reader) => untoldEvents(reader, 10));
  expect(events.map((event) => [event.identity, event.machineId, event.fromBacklog])).toEqual([
    ['event 0', 1, false],
    ['event 1', null, true],
    ['event 2', 1, false],
  ]);
  const tells = [events[0]?.id ?? 0, events[2]?.id ?? 0];
  const first = await insert(ledger, message('m1', { tells }));
  expect(first.isNew).toBe(true);
  // After a kill before the commit was seen: the same message again, with other bytes.
  const again = await insert(ledger, message('m1', { tells, subject: 'other', deliveries: [] }));
  expect(again).toEqual({ id: first.id, isNew: false });
  expect((await ledger.read((reader) => messageByIdentity(reader, 'm1')))?.subject).toBe('danger 1');
  const stored = await ledger.read((reader) => deliveriesOf(reader, first.id));
  expect(
    stored.map((row) => [row.recipient, Buffer.from(row.bytes).toString(), row.state, row.tries]),
  ).toEqual([
    ['a@larkfen.example', 'mail m1 to a@larkfen.example', 'waiting', 0],
    ['b@larkfen.example', 'mail m1 to b@larkfen.example', 'waiting', 0],
  ]);
  expect((await ledger.read((reader) => untoldEvents(reader, 10))).map((event) => event.identity)).toEqual([
    'event 1',
  ]);
  expect(
    (await ledger.read((reader) => eventsOfMessage(reader, first.id))).map((event) => event.identity),
  ).toEqual(['event 0', 'event 2']);
  await insert(ledger, message('m2', { tells }));
  expect((await ledger.read((reader) => eventsOfMessage(reader, first.id))).length).toBe(2);
});

test('what is due leaves most urgent first, and never before its time', async () => {
  const ledger = await withEvents(0);
  await insert(ledger, message('summary', { kind: 'summary', priority: 3 }));
  await insert(ledger, message('danger', { priority: 0 }));
  await insert(ledger, message('held', { priority: 0, notBeforeMs: 500 }));
  const due = async (nowMs: number, limit = 10) =>
    (await ledger.read((reader) => dueDeliveries(reader, nowMs, limit))).map(
      ({ message: of, delivery }) => `${of.identity} ${delivery.recipient[0]}`,
    );
  expect(await due(99)).toEqual([]);
  expect(await due(100)).toEqual(['danger a', 'danger b', 'summary a', 'summary b']);
  expect(await due(500, 3)).toEqual(['danger a', 'danger b', 'held a']);
});

test('each recipient has an answer of its own; what is done stays done', async () => {
  const ledger = await withEvents(0);
  const { id } = await insert(ledger, message('m'));
  const answer = (
    recipient: string,
    state: 'waiting' | 'accepted' | 'failed',
    tries: number,
    dueMs: number,
  ) =>
    ledger.transact((writer) =>
      storeAnswer(writer, `<m.${recipient}@larkfen.example>`, {
        state,
        tries,
        triedMs: 200 + tries,
        dueMs,
        lastAnswer: `${state} ${tries}`,
      }),
    );
  expect(await answer('a', 'accepted', 1, 200)).toBe(true);
  expect(await answer('b', 'waiting', 2, 900)).toBe(true);
  expect(await answer('a', 'failed', 3, 300)).toBe(false);
  const rows = await ledger.read((reader) => deliveriesOf(reader, id));
  expect(rows.map((row) => [row.state, row.tries, row.dueMs, row.lastAnswer, row.lastTryMs])).toEqual([
    ['accepted', 1, 200, 'accepted 1', 201],
    ['waiting', 2, 900, 'waiting 2', 202],
  ]);
  expect(await ledger.read(outboxCounts)).toEqual({
    deliveries: { waiting: 1, accepted: 1, failed: 0, superseded: 0 },
    untold: 0,
    oldestWaitingMs: 100,
    lastAnswer: { triedMs: 202, answer: 'waiting 2', state: 'waiting' },
  });
});

test('a newer summary takes the place of an older one that still waits, and of no other message', async () => {
  const ledger = await withEvents(0);
  const alarm = await insert(ledger, message('alarm'));
  const old = await insert(ledger, message('old', { kind: 'summary' }));
  const newer = await insert(ledger, message('newer', { kind: 'summary' }));
  await ledger.transact((writer) =>
    storeAnswer(writer, '<old.a@larkfen.example>', {
      state: 'accepted',
      tries: 1,
      triedMs: 1,
      dueMs: 1,
      lastAnswer: '250 ok',
    }),
  );
  expect(await ledger.transact((writer) => supersedeOlder(writer, 'summary', newer.id))).toBe(1);
  expect(await ledger.transact((writer) => supersedeOlder(writer, 'summary', newer.id))).toBe(0);
  const states = async (id: number) =>
    (await ledger.read((reader) => deliveriesOf(reader, id))).map((row) => row.state);
  expect(await states(old.id)).toEqual(['accepted', 'superseded']);
  expect(await states(alarm.id)).toEqual(['waiting', 'waiting']);
  expect(await states(newer.id)).toEqual(['waiting', 'waiting']);
  expect((await ledger.read((reader) => messageByIdentity(reader, 'old')))?.supersededBy).toBe(newer.id);
});

test('one thread runs a machine and one the site, from opened to closed', async () => {
  const ledger = await withEvents(0);
  await ledger.transact(async (writer) => {
    const thread = { openedMs: 1, subject: 'alert 1', severity: 'alert' } as const;
    const id = await openThread(writer, { ...thread, machineId: 1 });
    const siteId = await openThread(writer, { ...thread, machineId: null });
    expect((await openThreadOf(writer, 1))?.id).toBe(id);
    expect((await openThreadOf(writer, null))?.id).toBe(siteId);
    await changeThread(writer, id, { subject: 'danger 1', severity: 'danger' });
    expect(await openThreadOf(writer, 1)).toEqual({
      id,
      machineId: 1,
      openedMs: 1,
      subject: 'danger 1',
      severity: 'danger',
    });
    for (const identity of ['m1', 'm2', 'm3'])
      await insertMessage(writer, message(identity, { threadId: id }));
    await insertMessage(writer, message('m4', { threadId: siteId }));
    expect(await mailIdsOfThread(writer, id, 'a@larkfen.example', 2)).toEqual([
      '<m2.a@larkfen.example>',
      '<m3.a@larkfen.example>',
    ]);
    await closeThread(writer, id, 50);
    expect(await openThreadOf(writer, 1)).toBeNull();
    await openThread(writer, { ...thread, machineId: 1 });
  });
  for (const machineId of [1, null]) {
    const second = ledger.transact((writer) =>
      openThread(writer, { machineId, openedMs: 2, subject: 's', severity: 'alert' }),
    );
    await expect(second).rejects.toThrow('UNIQUE');
  }
});

test('a local date has one summary, the first', async () => {
  const ledger = await withEvents(0);
  const summary = (localDate: string, html: string) => ({
    localDate,
    createdMs: 1,
    messageId: null,
    html,
    facts: '{}',
  });
  const keep = (localDate: string, html: string) =>
    ledger.transact((writer) => keepSummary(writer, summary(localDate, html)));
  expect(await ledger.read((reader) => readSummary(reader))).toBeNull();
  expect(await keep('2026-12-02', 'b')).toBe(true);
  expect(await keep('2026-12-01', 'a')).toBe(true);
  expect(await keep('2026-12-02', 'c')).toBe(false);
  expect(await ledger.read((reader) => readSummary(reader))).toEqual(summary('2026-12-02', 'b'));
  expect((await ledger.read((reader) => readSummary(reader, '2026-12-01')))?.html).toBe('a');
});
