import { groupsDue, nextGroupDueMs } from '../advisory/outbox.ts';
import type { MailSettings } from '../config/site.ts';
import { isLedgersOwn } from '../store/ledger-error.ts';
import type { Reader } from '../store/lent-connection.ts';
import { type UntoldEvent, untoldEvents } from '../store/messages.ts';
import { hasUntold, openThreads, standsFor } from '../store/thread-ends.ts';
import { closeThread, type Thread } from '../store/threads.ts';
import { sortEvents } from './catch-up.ts';
import { type Draft, type DraftFrom, draftAlarmMail, draftCatchUp } from './draft.ts';
import { type MailTools, wallMsOf } from './mail-tools.ts';
import { plainDraft, stackOf } from './plain-draft.ts';
import { deliveriesFor, storeDraft } from './store-draft.ts';

/**
 * From events due to be told to messages in the outbox. Read the facts in one reading of the ledger, make words and
 * bytes of them outside, then store message, deliveries and 'told by this' in one transaction, which first makes sure
 * that nothing has changed under the draft.
 */
export interface ComposeHow {
  /** Gathering is over: everything decided on leaves now. */
  readonly flush: boolean;
  /** No mail leaves at present: only danger is composed, the rest goes on gathering. */
  readonly onlyDanger: boolean;
}

export interface Composed {
  readonly messages: number;
  /** Something is due but is held back because no mail leaves. */
  readonly heldBack: boolean;
  /** Wall time at which the next group will be due; null: no event waits. */
  readonly nextDueMs: number | null;
}

interface Look {
  readonly draft: Draft | null;
  /** The same events in plain words, should the draft's bytes fail. */
  readonly plain?: (error: unknown) => Draft;
  readonly heldBack: boolean;
  readonly nextDueMs: number | null;
}

/** Events that are looked at in one go; what is beyond them waits its turn. */
const eventsAtOnce = 500;
/** How often a draft is made again because the ledger moved on under it, before it is left to the next round. */
const mostTries = 5;

export async function composeDue(tools: MailTools, mail: MailSettings, how: ComposeHow): Promise<Composed> {
  let messages = 0;
  for (let failed = 0; failed < mostTries; ) {
    const nowMs = wallMsOf(tools.clock);
    const look = await tools.ledger.read((reader) => lookForDue(reader, tools, mail, how, nowMs));
    if (look.draft === null) return { messages, heldBack: look.heldBack, nextDueMs: look.nextDueMs };
    if (await store(tools, mail, look, look.draft, nowMs)) messages++;
    else failed++;
  }
  tools.complaints.say('compose', 'the ledger kept changing while a message was composed; tried again soon');
  return { messages, heldBack: false, nextDueMs: wallMsOf(tools.clock) };
}

async function store(
  tools: MailTools,
  mail: MailSettings,
  { plain }: Look,
  full: Draft,
  nowMs: number,
): Promise<boolean> {
  let draft = full;
  const deliveries = await deliveriesFor(full, mail.from, nowMs).catch((error: unknown) => {
    if (plain === undefined) throw error;
    draft = plain(error);
    return deliveriesFor(draft, mail.from, nowMs);
  });
  const stored = await tools.ledger.transact((writer) => storeDraft(writer, draft, deliveries, nowMs));
  if (!stored) return false;
  tools.step('delivery: message stored');
  const { kind, subject } = draft;
  if (deliveries.length > 0)
    tools.log.info({ kind, subject, recipients: deliveries.length }, 'message composed');
  else tools.log.warn({ kind, subject }, 'a message that nobody is to get: see mail: to in the site file');
  return true;
}

/** The most urgent message that is due, or when there will be one. */
async function lookForDue(
  reader: Reader,
  tools: MailTools,
  mail: MailSettings,
  how: ComposeHow,
  nowMs: number,
): Promise<Look> {
  const backlogRuns = !how.flush && (tools.backlogRuns?.() ?? false);
  const events = await untoldEvents(reader, eventsAtOnce, { withoutBacklog: backlogRuns });
  if (events.length === 0) return { draft: null, heldBack: false, nextDueMs: null };
  const times = how.flush ? { gatherMs: 0, gatherDangerMs: 0 } : mail;
  const sorted = await sortEvents(reader, events, nowMs, mail.catchUpAfterMs);
  const from: DraftFrom = { view: tools.view(), mail, ledgerId: tools.ledger.id, nowMs };
  const due = groupsDue(sorted.toTell.map(grouped), nowMs, times);
  const first = due.find(({ severity }) => severity === 'danger' || !how.onlyDanger);
  if (first !== undefined) {
    const told = first.events.map(({ event }) => event);
    const machineId = told[0]?.machineId ?? null;
    const drafted = await draftOrPlain(tools, from, told, () =>
      draftAlarmMail(reader, from, machineId, told),
    );
    return { ...drafted, heldBack: false, nextDueMs: nowMs };
  }
  const passed = [sorted.backlog, sorted.waitedLong].find(
    (group) => groupsDue(group.map(together), nowMs, times).length > 0,
  );
  const heldBack = how.onlyDanger && (due.length > 0 || passed !== undefined);
  if (passed !== undefined && !heldBack) {
    const drafted = await draftOrPlain(tools, from, passed, () => draftCatchUp(reader, from, passed));
    return { ...drafted, heldBack, nextDueMs: nowMs };
  }
  const waiting = [...sorted.toTell.map(grouped), ...[...sorted.backlog, ...sorted.waitedLong].map(together)];
  return { draft: null, heldBack, nextDueMs: nextGroupDueMs(waiting, times) };
}

/** One message that cannot be composed is told in plain words and logged, and keeps no other. */
async function draftOrPlain(
  tools: MailTools,
  from: DraftFrom,
  events: readonly UntoldEvent[],
  full: () => Promise<Draft>,
): Promise<Required<Pick<Look, 'draft' | 'plain'>>> {
  const plain = (error: unknown) => {
    const numbers = [...new Set(events.map(({ number }) => number))];
    tools.log.error(
      { numbers, error: stackOf(error) },
      'a message could not be composed; sent in plain words',
    );
    return plainDraft(from, events, error);
  };
  try {
    return { draft: await full(), plain };
  } catch (error) {
    if (isLedgersOwn(error)) throw error;
    return { draft: plain(error), plain };
  }
}

/** Events of one machine travel together. */
function grouped(event: UntoldEvent) {
  const machineId = event.machineId === null ? null : String(event.machineId);
  return { id: event.id, machineId, severity: event.severity, wallMs: event.wallMs, event };
}

/** What came and went is gathered over all machines, and is no longer urgent. */
function together(event: UntoldEvent) {
  return { ...grouped(event), machineId: null, severity: 'trouble' as const };
}

/** Ends the conversations of machines of which nothing stands, waits for a person, or is still to be told. */
export async function closeThreads(tools: Pick<MailTools, 'ledger' | 'clock'>): Promise<number> {
  const over = await tools.ledger.read(threadsOver);
  if (over.length === 0) return 0;
  const nowMs = wallMsOf(tools.clock);
  return tools.ledger.transact(async (writer) => {
    const threads = await threadsOver(writer);
    for (const { id } of threads) await closeThread(writer, id, nowMs);
    return threads.length;
  });
}

async function threadsOver(reader: Reader): Promise<Thread[]> {
  const over: Thread[] = [];
  for (const thread of await openThreads(reader)) {
    const { machineId } = thread;
    if (!(await standsFor(reader, machineId)) && !(await hasUntold(reader, machineId))) over.push(thread);
  }
  return over;
}
