import type { Severity } from '../config/site.ts';
import type { JournalEventName } from '../detection/alarm.ts';
import type { Reader, Writer } from './lent-connection.ts';

/** What people were told of lives that wait for them, and what became of the mails. */

/** One telling of a life; the newest telling anew and the reminders after it. */
export interface LifeTold {
  readonly number: number;
  readonly key: string;
  readonly machineId: number | null;
  /** The telling that is to be acknowledged. */
  readonly first: ToldEvent;
  /** Reminders of it, oldest first, also those that were withdrawn. */
  readonly reminders: readonly ToldEvent[];
}

export interface ToldEvent {
  readonly event: JournalEventName;
  readonly severity: Severity;
  readonly identity: string;
  readonly wallMs: number;
  /** Null: it is in no message yet. */
  readonly messageId: number | null;
  readonly withdrawn: boolean;
}

/** Lives that have not ended, that nobody has acknowledged and of which people were told; oldest number first. */
export async function unacknowledgedTold(reader: Reader, number?: number): Promise<LifeTold[]> {
  let query = reader
    .selectFrom('alarms as life')
    .innerJoin('to_tell as event', 'event.number', 'life.number')
    .select([
      'life.number',
      'life.key',
      'event.machine_id',
      'event.event',
      'event.severity',
      'event.identity',
      'event.wall_ms',
      'event.message_id',
      'event.withdrawn_ms',
    ])
    .where('life.ended_wall_ms', 'is', null)
    .where('life.acknowledged_wall_ms', 'is', null);
  if (number !== undefined) query = query.where('life.number', '=', number);
  const rows = await query.orderBy('life.number').orderBy('event.id').execute();
  const lives = new Map<number, LifeTold>();
  for (const row of rows) {
    const told: ToldEvent = {
      event: row.event as JournalEventName,
      severity: row.severity as Severity,
      identity: row.identity,
      wallMs: row.wall_ms,
      messageId: row.message_id,
      withdrawn: row.withdrawn_ms !== null,
    };
    const life = lives.get(row.number);
    if (told.event !== 'reminded') {
      const { number, key, machine_id: machineId } = row;
      lives.set(number, { number, key, machineId, first: told, reminders: [] });
    } else if (life !== undefined) lives.set(row.number, { ...life, reminders: [...life.reminders, told] });
  }
  return [...lives.values()];
}

/**
 * When a message was told: as soon as a server took it for anybody; where every recipient's was refused for good, or it has
 * none, when it was made. Null: it still waits.
 */
export async function toldAtMs(reader: Reader, messageId: number): Promise<number | null> {
  const message = await reader
    .selectFrom('messages')
    .select('created_ms')
    .where('id', '=', messageId)
    .executeTakeFirst();
  const deliveries = await reader
    .selectFrom('deliveries')
    .select(['state', 'last_try_ms'])
    .where('message_id', '=', messageId)
    .orderBy('last_try_ms')
    .execute();
  const accepted = deliveries.find(({ state }) => state === 'accepted');
  if (accepted !== undefined) return accepted.last_try_ms;
  return deliveries.some(({ state }) => state === 'waiting') ? null : (message?.created_ms ?? null);
}

/** Acknowledged lives that have not ended: number, key, when. */
export async function acknowledgedLives(
  reader: Reader,
): Promise<{ readonly number: number; readonly key: string; readonly acknowledgedMs: number }[]> {
  const rows = await reader
    .selectFrom('alarms')
    .select(['number', 'key', 'acknowledged_wall_ms as acknowledgedMs'])
    .where('ended_wall_ms', 'is', null)
    .where('acknowledged_wall_ms', 'is not', null)
    .orderBy('number')
    .execute();
  return rows.map((row) => ({ ...row, acknowledgedMs: row.acknowledgedMs as number }));
}

/** Reminders in no message yet. */
export async function untoldReminders(
  reader: Reader,
): Promise<{ readonly id: number; readonly number: number | null }[]> {
  return reader
    .selectFrom('to_tell')
    .select(['id', 'number'])
    .where('message_id', 'is', null)
    .where('withdrawn_ms', 'is', null)
    .where('event', '=', 'reminded')
    .orderBy('id')
    .execute();
}

/** Mails that wait and tell of nothing but reminders, with the numbers of these. */
export async function waitingReminders(
  reader: Reader,
): Promise<{ readonly messageId: number; readonly numbers: readonly number[] }[]> {
  const rows = await reader
    .selectFrom('deliveries')
    .innerJoin('to_tell as event', 'event.message_id', 'deliveries.message_id')
    .select(['deliveries.message_id as messageId', 'event.event', 'event.number'])
    .where('state', '=', 'waiting')
    .orderBy('event.id')
    .execute();
  const byMessage = new Map<number, Set<number>>();
  const others = new Set<number>();
  for (const { messageId, event, number } of rows) {
    if (event !== 'reminded' || number === null) others.add(messageId);
    else byMessage.set(messageId, (byMessage.get(messageId) ?? new Set()).add(number));
  }
  return [...byMessage]
    .filter(([messageId]) => !others.has(messageId))
    .map(([messageId, numbers]) => ({ messageId, numbers: [...numbers] }));
}

export async function withdrawEvents(writer: Writer, ids: readonly number[], wallMs: number): Promise<void> {
  await writer
    .updateTable('to_tell')
    .set({ withdrawn_ms: wallMs })
    .where('id', 'in', ids)
    .where('message_id', 'is', null)
    .execute();
}

/** What waits of a message is not sent any more; `why` stands in the place of a server's answer. */
export async function giveUpWaiting(writer: Writer, messageId: number, why: string): Promise<void> {
  await writer
    .updateTable('deliveries')
    .set({ state: 'superseded', last_answer: why })
    .where('message_id', '=', messageId)
    .where('state', '=', 'waiting')
    .execute();
}
