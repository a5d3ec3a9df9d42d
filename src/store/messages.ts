import type { Selectable } from 'kysely';
import type { Severity } from '../config/site.ts';
import type { JournalEventName } from '../detection/alarm.ts';
import type { MessagesTable, ToTellTable } from './alarm-tables.ts';
import type { Reader, Writer } from './lent-connection.ts';

export type MessageKind = 'alarm' | 'flood' | 'catch-up' | 'summary' | 'service' | 'test';

/** An event that is still to be put into a message. */
export interface UntoldEvent {
  readonly id: number;
  readonly journalSequence: number;
  readonly key: string | null;
  readonly number: number | null;
  readonly machineId: number | null;
  readonly severity: Severity;
  readonly event: JournalEventName;
  readonly level: number | null;
  readonly identity: string;
  readonly wallMs: number;
  readonly fromBacklog: boolean;
}

/** `bytes`: the whole mail to this recipient, stored before the first attempt. `mailId`: its Message-ID. */
export interface NewDelivery {
  readonly recipient: string;
  readonly mailId: string;
  readonly bytes: Uint8Array;
  readonly dueMs: number;
}

export interface NewMessage {
  readonly kind: MessageKind;
  /** Names the message for ever. */
  readonly identity: string;
  /** Smaller leaves first. */
  readonly priority: number;
  readonly groupKey: string;
  readonly threadId: number | null;
  readonly subject: string;
  readonly createdMs: number;
  readonly notBeforeMs: number;
  readonly deliveries: readonly NewDelivery[];
  /** Events (UntoldEvent.id) that this message tells. */
  readonly tells: readonly number[];
}

export interface StoredMessage extends Omit<NewMessage, 'deliveries' | 'tells'> {
  readonly id: number;
  readonly supersededBy: number | null;
}

/**
 * At most `limit` events not yet in any message, oldest first; where there are more, danger before the rest, then the
 * oldest. `withoutBacklog`: what a backlog raised does not count.
 */
export async function untoldEvents(
  reader: Reader,
  limit: number,
  { withoutBacklog = false } = {},
): Promise<UntoldEvent[]> {
  const untold = reader
    .selectFrom('to_tell')
    .selectAll()
    .where('message_id', 'is', null)
    .where('withdrawn_ms', 'is', null);
  const rows = await (withoutBacklog ? untold.where('from_backlog', '=', 0) : untold)
    .orderBy(({ case: when }) => when().when('severity', '=', 'danger').then(0).else(1).end())
    .orderBy('id')
    .limit(limit)
    .execute();
  return rows.map(untoldEvent).sort((a, b) => a.id - b.id);
}

/** Whether none of these events (UntoldEvent.id) is in a message. */
export async function areUntold(reader: Reader, ids: readonly number[]): Promise<boolean> {
  if (ids.length === 0) return true;
  const row = await reader
    .selectFrom('to_tell')
    .select(({ fn }) => fn.countAll<number>().as('count'))
    .where('id', 'in', ids)
    .where('message_id', 'is', null)
    .where('withdrawn_ms', 'is', null)
    .executeTakeFirstOrThrow();
  return row.count === new Set(ids).size;
}

/** Events that a message tells, oldest first. */
export async function eventsOfMessage(reader: Reader, messageId: number): Promise<UntoldEvent[]> {
  const rows = await reader
    .selectFrom('to_tell')
    .selectAll()
    .where('message_id', '=', messageId)
    .orderBy('id')
    .execute();
  return rows.map(untoldEvent);
}

/**
 * Stores a message with a delivery for each recipient and marks its events as told by it. Where a message of that
 * identity is stored already, that one stays as it is, `isNew` is false, and the events are linked to it.
 */
export async function insertMessage(
  writer: Writer,
  message: NewMessage,
): Promise<{ readonly id: number; readonly isNew: boolean }> {
  const made = await writer
    .insertInto('messages')
    .values({
      kind: message.kind,
      identity: message.identity,
      priority: message.priority,
      group_key: message.groupKey,
      thread_id: message.threadId,
      subject: message.subject,
      created_ms: message.createdMs,
      not_before_ms: message.notBeforeMs,
      superseded_by: null,
    })
    .onConflict((conflict) => conflict.column('identity').doNothing())
    .returning('id')
    .executeTakeFirst();
  const id = made?.id ?? (await messageByIdentity(writer, message.identity))?.id;
  if (id === undefined) throw new Error(`message ${message.identity} is neither new nor stored`);
  if (made !== undefined) {
    for (const delivery of message.deliveries) await insertDelivery(writer, id, delivery);
  }
  if (message.tells.length > 0) {
    await writer
      .updateTable('to_tell')
      .set({ message_id: id })
      .where('id', 'in', message.tells)
      .where('message_id', 'is', null)
      .where('withdrawn_ms', 'is', null)
      .execute();
  }
  return { id, isNew: made !== undefined };
}

async function insertDelivery(writer: Writer, messageId: number, delivery: NewDelivery): Promise<void> {
  await writer
    .insertInto('deliveries')
    .values({
      message_id: messageId,
      recipient: delivery.recipient,
      mail_id: delivery.mailId,
      bytes: delivery.bytes,
      due_ms: delivery.dueMs,
      tries: 0,
      last_try_ms: null,
      last_answer: null,
      state: 'waiting',
    })
    .execute();
}

export async function messageByIdentity(reader: Reader, identity: string): Promise<StoredMessage | null> {
  const row = await reader
    .selectFrom('messages')
    .selectAll()
    .where('identity', '=', identity)
    .executeTakeFirst();
  return row === undefined ? null : storedMessage(row);
}

/** Older messages of a kind that still wait for somebody give way to `newerId`; returns how many did. */
export async function supersedeOlder(writer: Writer, kind: MessageKind, newerId: number): Promise<number> {
  const older = await writer
    .selectFrom('messages')
    .innerJoin('deliveries', 'deliveries.message_id', 'messages.id')
    .select('messages.id')
    .distinct()
    .where('messages.kind', '=', kind)
    .where('messages.id', '<', newerId)
    .where('deliveries.state', '=', 'waiting')
    .orderBy('messages.id')
    .execute();
  for (const { id } of older) {
    await writer.updateTable('messages').set({ superseded_by: newerId }).where('id', '=', id).execute();
    await writer
      .updateTable('deliveries')
      .set({ state: 'superseded' })
      .where('message_id', '=', id)
      .where('state', '=', 'waiting')
      .execute();
  }
  return older.length;
}

function untoldEvent(row: Selectable<ToTellTable>): UntoldEvent {
  return {
    id: row.id,
    journalSequence: row.journal_sequence,
    key: row.key,
    number: row.number,
    machineId: row.machine_id,
    severity: row.severity as Severity,
    event: row.event as JournalEventName,
    level: row.level,
    identity: row.identity,
    wallMs: row.wall_ms,
    fromBacklog: row.from_backlog === 1,
  };
}

export function storedMessage(row: Selectable<MessagesTable>): StoredMessage {
  return {
    id: row.id,
    kind: row.kind as MessageKind,
    identity: row.identity,
    priority: row.priority,
    groupKey: row.group_key,
    threadId: row.thread_id,
    subject: row.subject,
    createdMs: row.created_ms,
    notBeforeMs: row.not_before_ms,
    supersededBy: row.superseded_by,
  };
}
