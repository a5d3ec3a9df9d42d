import type { Selectable } from 'kysely';
import type { DeliveriesTable } from './alarm-tables.ts';
import type { Reader, Writer } from './lent-connection.ts';
import { type NewDelivery, type StoredMessage, storedMessage } from './messages.ts';

export type DeliveryState = 'waiting' | 'accepted' | 'failed' | 'superseded';

export interface StoredDelivery extends NewDelivery {
  readonly messageId: number;
  readonly tries: number;
  readonly lastTryMs: number | null;
  readonly lastAnswer: string | null;
  readonly state: DeliveryState;
}

export interface DueDelivery {
  readonly message: StoredMessage;
  readonly delivery: StoredDelivery;
}

/** Deliveries whose time has come, most urgent first, then the one that is due longest; with their bytes. */
export async function dueDeliveries(reader: Reader, nowMs: number, limit: number): Promise<DueDelivery[]> {
  const rows = await reader
    .selectFrom('deliveries')
    .innerJoin('messages', 'messages.id', 'deliveries.message_id')
    .selectAll('messages')
    .select([
      'mail_id',
      'message_id',
      'recipient',
      'due_ms',
      'tries',
      'last_try_ms',
      'last_answer',
      'state',
      'bytes',
    ])
    .where('state', '=', 'waiting')
    .where('due_ms', '<=', nowMs)
    .where('not_before_ms', '<=', nowMs)
    .orderBy('priority')
    .orderBy('due_ms')
    .orderBy('mail_id')
    .limit(limit)
    .execute();
  return rows.map((row) => ({ message: storedMessage(row), delivery: storedDelivery(row) }));
}

export async function deliveriesOf(reader: Reader, messageId: number): Promise<StoredDelivery[]> {
  const rows = await reader
    .selectFrom('deliveries')
    .selectAll()
    .where('message_id', '=', messageId)
    .orderBy('recipient')
    .execute();
  return rows.map(storedDelivery);
}

/** Stores what an attempt came to. A delivery that is no longer waiting keeps its state: false then. */
export async function storeAnswer(
  writer: Writer,
  mailId: string,
  answer: {
    readonly state: 'waiting' | 'accepted' | 'failed';
    readonly tries: number;
    readonly triedMs: number;
    readonly dueMs: number;
    readonly lastAnswer: string;
  },
): Promise<boolean> {
  const rows = await writer
    .updateTable('deliveries')
    .set({
      state: answer.state,
      tries: answer.tries,
      last_try_ms: answer.triedMs,
      due_ms: answer.dueMs,
      last_answer: answer.lastAnswer,
    })
    .where('mail_id', '=', mailId)
    .where('state', '=', 'waiting')
    .returning('mail_id')
    .execute();
  return rows.length === 1;
}

function storedDelivery(row: Selectable<DeliveriesTable>): StoredDelivery {
  return {
    messageId: row.message_id,
    recipient: row.recipient,
    mailId: row.mail_id,
    bytes: row.bytes,
    dueMs: row.due_ms,
    tries: row.tries,
    lastTryMs: row.last_try_ms,
    lastAnswer: row.last_answer,
    state: row.state as DeliveryState,
  };
}
