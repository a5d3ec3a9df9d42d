import { floodRule } from '../advisory/flood.ts';
import { groupsDue, nextGroupDueMs } from '../advisory/outbox.ts';
import { recipientsAt } from '../advisory/recipients.ts';
import type { MailSettings } from '../config/site.ts';
import { isLedgersOwn } from '../store/ledger-error.ts';
import type { Reader } from '../store/lent-connection.ts';
import { type UntoldEvent, untoldEvents } from '../store/messages.ts';
import { hasUntold, openThreads, standsFor } from '../store/thread-ends.ts';
import { closeThread, type Thread } from '../store/threads.ts';
import { sortEvents } from './catch-up.ts';
import { type Draft, type DraftFrom, draftAlarmMail, draftCatchUp } from './draft.ts';
import { draftFlood } from './draft-flood.ts';
import { leavingNow, leavingTogether } from './leaving.ts';
import { type MailTools, wallMsOf } from './mail-tools.ts';
import { plainDraft, stackOf } from './plain-draft.ts';
import { deliveriesFor, storeDraft } from './store-draft.ts';
import { standingTooLong, tellStanding } from './watch-acknowledged.ts';
import { floodTurns, turnFlood } from './watch-flood.ts';
import { makeReminders, needlessReminders, toRemindOf, withdrawReminders } from './watch-reminders.ts';

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

/** Events that are looked at in one go: more only where these all wait for somebody's hours or for the morning. */
const eventsAtOnce = [500, 8_000];
/** How often a draft is made again because the ledger moved on under it, before it is left to the next round. */
const mostTries = 5;

export async function composeDue(tools: MailTools, mail: MailSettings, how: ComposeHow): Promise<Composed> {
  let messages = 0;
  for (let failed = 0; failed < mostTries; ) {
    const nowMs = wallMsOf(tools.clock);
    await watch(tools, mail, nowMs);
    const look = await tools.ledger.read((reader) => lookForDue(reader, tools, mail, how, nowMs));
    if (look.draft === null) return { messages, heldBack: look.heldBack, nextDueMs: look.nextDueMs };
    if (await store(tools, mail, look, look.draft, nowMs)) messages++;
    else failed++;
  }
  tools.complaints.say('compose', 'the ledger kept changing while a message was composed; tried again soon');
  return { messages, heldBack: false, nextDueMs: wallMsOf(tools.clock) };
}

/** What time alone brings about: reminders and their withdrawal, alarms told again, the beginning and end of a flood. */
async function watch(tools: MailTools, mail: MailSettings, nowMs: number): Promise<void> {
  const { ledger } = tools;
  const view = tools.view();
  const recipients = recipientsAt(mail.to, { ms: nowMs, timeZone: view.site.timeZone });
  const look = { view, mail, recipients, nowMs };
  const due = await ledger.read(async (reader) => ({
    needless: await needlessReminders(reader),
    standing: await standingTooLong(reader, view, nowMs),
    remind: await toRemindOf(reader, look),
    flood: await floodTurns(reader, nowMs),
  }));
  const { events, messages } = due.needless;
  if (events.length + messages.length > 0)
    await ledger.transact((writer) => withdrawReminders(writer, nowMs));
  await tellStanding(ledger, view, nowMs, due.standing);
  const made = await makeReminders(ledger, look, due.remind);
  if (due.flood || made > floodRule.endsBelow) await turnFlood(ledger, view, nowMs);
}

async function store(
  tools: MailTools,
  mail: MailSettings,
  { plain }: Look,
  full: Draft,
  nowMs: number,
): Promise<boolean> {
  let draft = full;
  const undrawn = (picture: string, reason: string) =>
    tools.log.warn({ subject: full.subject, picture, reason }, 'a mail leaves without one of its pictures');
  const deliveries = await deliveriesFor(full, mail.from, nowMs, undrawn).catch((error: unknown) => {
    if (plain === undefined) throw error;
    draft = plain(error);
    return deliveriesFor(draft, mail.from, nowMs);
  });
  const stored = await tools.ledger.transact(async (writer) => {
    await withdrawReminders(writer, nowMs);
    return storeDraft(writer, draft, deliveries, nowMs);
  });
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
  const withoutBacklog = !how.flush && (tools.backlogRuns?.() ?? false);
  let look: Look = { draft: null, heldBack: false, nextDueMs: null };
  for (const limit of eventsAtOnce) {
    const events = await untoldEvents(reader, limit, { withoutBacklog });
    if (events.length === 0) return look;
    look = await lookAmong(reader, tools, mail, how, { events, nowMs });
    if (look.draft !== null || look.heldBack || events.length < limit) return look;
  }
  return look;
}

async function lookAmong(
  reader: Reader,
  tools: MailTools,
  mail: MailSettings,
  how: ComposeHow,
  { events, nowMs }: { readonly events: readonly UntoldEvent[]; readonly nowMs: number },
): Promise<Look> {
  const times = how.flush ? { gatherMs: 0, gatherDangerMs: 0 } : mail;
  const sorted = await sortEvents(reader, events, nowMs, mail.catchUpAfterMs);
  const view = tools.view();
  const recipients = recipientsAt(mail.to, { ms: nowMs, timeZone: view.site.timeZone });
  const from: DraftFrom = { view, mail, recipients, ledgerId: tools.ledger.id, nowMs };
  const now = await leavingNow(reader, from, sorted.toTell);
  const due = groupsDue(now.leaving, nowMs, times);
  const first = due.find(({ severity }) => severity === 'danger' || !how.onlyDanger);
  if (first !== undefined) {
    const told = first.events.map(({ event }) => event);
    const { group } = first;
    const drafted = await draftOrPlain(tools, from, told, () =>
      group?.startsWith('flood:')
        ? draftFlood(reader, from, group, told)
        : draftAlarmMail(reader, from, told[0]?.machineId ?? null, told),
    );
    return { ...drafted, heldBack: false, nextDueMs: nowMs };
  }
  const together = [sorted.backlog, sorted.waitedLong].map((group) => leavingTogether(from, group));
  const passed = together.find(({ leaving }) => groupsDue(leaving, nowMs, times).length > 0);
  const heldBack = how.onlyDanger && (due.length > 0 || passed !== undefined);
  if (passed !== undefined && !heldBack) {
    const told = passed.leaving.map(({ event }) => event);
    const drafted = await draftOrPlain(tools, from, told, () => draftCatchUp(reader, from, told));
    return { ...drafted, heldBack, nextDueMs: nowMs };
  }
  const all = [now, ...together].flatMap(({ leaving, waiting }) => [...leaving, ...waiting]);
  return { draft: null, heldBack, nextDueMs: nextGroupDueMs(all, times) };
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
