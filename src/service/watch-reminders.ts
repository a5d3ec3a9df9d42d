import { type RecipientNow, reachOf } from '../advisory/recipients.ts';
import {
  dangerRemindAfterMs,
  type ReminderDue,
  type ReminderRule,
  reminderDue,
  reminderPauseMs,
} from '../advisory/reminders.ts';
import type { MailSettings, Severity } from '../config/site.ts';
import { heldStanding } from '../detection/alarm-state.ts';
import type { StandingLife } from '../store/alarms.ts';
import { appendJournal, appendTelling, tellingIdentity } from '../store/journal.ts';
import type { Ledger } from '../store/ledger.ts';
import type { Reader, Writer } from '../store/lent-connection.ts';
import {
  giveUpWaiting,
  type LifeTold,
  toldAtMs,
  unacknowledgedTold,
  untoldReminders,
  waitingReminders,
  withdrawEvents,
} from '../store/tellings.ts';
import { limitOf, machineOfId } from './fact-names.ts';
import { overnightMs } from './leaving.ts';
import type { SiteView } from './site-view.ts';
import { readableLife } from './standing-facts.ts';

/**
 * Reminders of what nobody has acknowledged. Each is one transaction: it is read there whether it is still due, journalled,
 * and put among the events to be told. One that an acknowledgement overtakes is withdrawn, from the events or from the
 * outbox, before anything more is sent.
 */
export interface ReminderLook {
  readonly view: SiteView;
  readonly mail: MailSettings;
  readonly recipients: readonly RecipientNow[];
  readonly nowMs: number;
}

interface Due extends ReminderDue {
  readonly life: LifeTold;
  readonly severity: Severity;
  readonly firstMs: number;
  readonly level: number | null;
}

/** Decides on the reminders of these lives, as far as they are due still; returns how many. */
export async function makeReminders(
  ledger: Ledger,
  look: ReminderLook,
  numbers: readonly number[],
): Promise<number> {
  let reminded = 0;
  for (const number of numbers) {
    const done = await ledger.transact(async (writer) => {
      const [due] = await remindersDue(writer, look, number);
      if (due === undefined) return false;
      await remind(writer, look, due);
      return true;
    });
    if (done) reminded++;
  }
  return reminded;
}

/** Numbers of the lives that somebody is to be reminded of. */
export async function toRemindOf(reader: Reader, look: ReminderLook): Promise<number[]> {
  return (await remindersDue(reader, look)).map(({ life }) => life.number);
}

async function remindersDue(reader: Reader, look: ReminderLook, number?: number): Promise<Due[]> {
  const due: Due[] = [];
  for (const life of await unacknowledgedTold(reader, number)) {
    const one = await dueOf(reader, look, life);
    if (one !== null) due.push(one);
  }
  return due;
}

async function dueOf(reader: Reader, look: ReminderLook, life: LifeTold): Promise<Due | null> {
  const { nowMs } = look;
  const newest = life.reminders.findLast(({ withdrawn }) => !withdrawn) ?? life.first;
  if (newest.messageId === null || life.first.messageId === null) return null;
  // Nothing is due so soon, whatever its rule says: no look into the ledger is worth it.
  if (nowMs - newest.wallMs < fewestPauseMs && nowMs >= newest.wallMs) return null;
  const standing = await readableLife(reader, life.number);
  if (standing === null || !waitsForPerson(standing)) return null;
  // Of what was told last: an alert that came again after a danger is not told as a danger.
  const { severity } = life.first;
  const rule = ruleFor(look, standing, severity);
  if (rule === null) return null;
  const number = life.reminders.length + 1;
  const pauseMs = 'ms' in rule.thenAfter ? fewestPauseMs : reminderPauseMs(rule, number);
  if (nowMs >= newest.wallMs && nowMs - newest.wallMs < pauseMs) return null;
  const lastMs = await toldAtMs(reader, newest.messageId);
  const firstMs = newest === life.first ? lastMs : await toldAtMs(reader, life.first.messageId);
  if (lastMs === null || firstMs === null) return null;
  const due = reminderDue(rule, { firstMs, lastMs, reminders: life.reminders.length }, nowMs);
  if (due === null || !mayLeave(look, life, severity)) return null;
  return { ...due, life, severity, firstMs, level: standing.alarm.state.knownLevel };
}

/** The least that a site file can ask for. */
const fewestPauseMs = 300_000;

/** It stands or is latched, unacknowledged, under no suppression. What is back to normal waits in the summary. */
function waitsForPerson({ alarm, life }: StandingLife): boolean {
  if (life.endedWallMs !== null || alarm.number !== life.number) return false;
  const standing = heldStanding(alarm.state);
  const waits = standing === 'unacknowledged' || standing === 'latched-unacknowledged';
  return waits && alarm.state.suppressions.length === 0;
}

/** The limit's own word, then that of `mail`, then the usual: danger after an hour, the rest never. */
function ruleFor(
  { view, mail }: ReminderLook,
  { alarm }: StandingLife,
  severity: Severity,
): ReminderRule | null {
  const { subject } = alarm;
  const limit =
    subject.kind === 'limit'
      ? limitOf(view.point(`${subject.machineId}/${subject.pointId}`), subject.limitId)
      : undefined;
  const usual = severity === 'danger' ? dangerRemindAfterMs : null;
  const ofMail = mail.reminders?.afterMs === undefined ? usual : mail.reminders.afterMs;
  const afterMs = limit?.remindAfterMs === undefined ? ofMail : limit.remindAfterMs;
  if (afterMs === null) return null;
  const thenTo = limit?.thenTo ?? mail.reminders?.thenTo ?? [];
  return { afterMs, thenTo, thenAfter: mail.reminders?.thenAfter ?? { reminders: 2 } };
}

/** A reminder is made when it can leave: somebody has the hour, and the night does not hold it. */
function mayLeave(look: ReminderLook, { machineId }: LifeTold, severity: Severity): boolean {
  const machine = machineId === null ? null : (machineOfId(look.view, machineId) ?? null);
  if (reachOf(look.recipients, machine, severity).waitsUntilMs !== null) return false;
  return overnightMs({ severity }, look) === null;
}

async function remind(writer: Writer, { view, nowMs }: ReminderLook, due: Due): Promise<void> {
  const { life, severity, number, thenTo, firstMs } = due;
  const { first } = life;
  const condition = (await readableLife(writer, life.number))?.alarm.state.condition ?? null;
  const sequence = await appendJournal(writer, {
    key: life.key,
    number: life.number,
    event: 'reminded',
    before: condition,
    after: condition,
    usedMs: null,
    wallMs: nowMs,
    recordingId: null,
    configVersionId: view.ids.configVersionId,
    actor: 'service',
    via: 'service',
    comment: null,
    reason: { reminder: number, toldMs: firstMs, thenTo },
  });
  await appendTelling(writer, {
    journalSequence: sequence,
    key: life.key,
    number: life.number,
    machineId: life.machineId,
    severity,
    event: 'reminded',
    level: due.level,
    identity: tellingIdentity([life.key, life.number, 'reminded', first.identity, number]),
    wallMs: nowMs,
    fromBacklog: false,
  });
}

const overtaken = 'not sent: acknowledged, or over, before it left';

/** Reminders that nobody needs any more give way, whether their mail is made or not; returns how many. */
export async function withdrawReminders(writer: Writer, nowMs: number): Promise<number> {
  const { events, messages } = await needlessReminders(writer);
  if (events.length > 0) await withdrawEvents(writer, events, nowMs);
  for (const messageId of messages) await giveUpWaiting(writer, messageId, overtaken);
  return events.length + messages.length;
}

export async function needlessReminders(
  reader: Reader,
): Promise<{ readonly events: number[]; readonly messages: number[] }> {
  const stillWaits = async (number: number | null) => {
    const life = number === null ? null : await readableLife(reader, number);
    return life !== null && waitsForPerson(life);
  };
  const events: number[] = [];
  for (const { id, number } of await untoldReminders(reader))
    if (!(await stillWaits(number))) events.push(id);
  const messages: number[] = [];
  for (const { messageId, numbers } of await waitingReminders(reader)) {
    let needed = false;
    for (const number of numbers) needed ||= await stillWaits(number);
    if (!needed) messages.push(messageId);
  }
  return { events, messages };
}
