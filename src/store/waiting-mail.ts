import type { Reader, Writer } from './lent-connection.ts';

/** What the delivery of mail asks of the outbox as a whole. */

/** When the next waiting delivery is due, and how many wait. */
export async function waitingMail(
  reader: Reader,
): Promise<{ readonly count: number; readonly nextDueMs: number | null }> {
  const row = await reader
    .selectFrom('deliveries')
    .select(({ fn }) => [fn.countAll<number>().as('count'), fn.min('due_ms').as('nextDueMs')])
    .where('state', '=', 'waiting')
    .executeTakeFirstOrThrow();
  return { count: row.count, nextDueMs: row.nextDueMs };
}

/** Deliveries that would wait beyond `laterThanMs` are due at `dueMs`; returns how many. */
export async function hastenWaiting(
  writer: Writer,
  to: { readonly laterThanMs: number; readonly dueMs: number },
): Promise<number> {
  const rows = await writer
    .updateTable('deliveries')
    .set({ due_ms: to.dueMs })
    .where('state', '=', 'waiting')
    .where('due_ms', '>', to.laterThanMs)
    .returning('mail_id')
    .execute();
  return rows.length;
}

/** Whether any delivery waits beyond that time: only a clock that was set back does that. */
export async function waitsBeyond(reader: Reader, laterThanMs: number): Promise<boolean> {
  const row = await reader
    .selectFrom('deliveries')
    .select('mail_id')
    .where('state', '=', 'waiting')
    .where('due_ms', '>', laterThanMs)
    .limit(1)
    .executeTakeFirst();
  return row !== undefined;
}

/** Of these recipients the ones whose newest delivery that came to an end was refused for good. */
export async function refusedRecipients(reader: Reader, recipients: readonly string[]): Promise<string[]> {
  const refused: string[] = [];
  for (const recipient of recipients) {
    const row = await reader
      .selectFrom('deliveries')
      .select('state')
      .where('last_try_ms', 'is not', null)
      .where('recipient', '=', recipient)
      .where('state', 'in', ['accepted', 'failed'])
      .orderBy('last_try_ms', 'desc')
      .orderBy('mail_id', 'desc')
      .limit(1)
      .executeTakeFirst();
    if (row?.state === 'failed') refused.push(recipient);
  }
  return refused;
}

export interface LastTold {
  readonly recipient: string;
  readonly mailId: string;
  readonly state: string;
  readonly lastTryMs: number | null;
}

/** Of each recipient the newest alarm mail that tells of the life of that number. */
export async function lastTold(reader: Reader, number: number): Promise<LastTold[]> {
  const rows = await reader
    .selectFrom('to_tell')
    .innerJoin('messages', 'messages.id', 'to_tell.message_id')
    .innerJoin('deliveries', 'deliveries.message_id', 'messages.id')
    .select(['recipient', 'mail_id', 'state', 'last_try_ms'])
    .where('to_tell.number', '=', number)
    .where('messages.kind', 'in', ['alarm', 'flood'])
    .orderBy('messages.id')
    .execute();
  const newest = new Map<string, LastTold>();
  for (const row of rows) {
    const { recipient, state } = row;
    newest.set(recipient, { recipient, mailId: row.mail_id, state, lastTryMs: row.last_try_ms });
  }
  return [...newest.values()];
}

/** Refused deliveries wait again, with the same bytes and Message-ID. */
export async function waitAgain(writer: Writer, mailIds: readonly string[], dueMs: number): Promise<void> {
  await writer
    .updateTable('deliveries')
    .set({ state: 'waiting', due_ms: dueMs })
    .where('mail_id', 'in', mailIds)
    .where('state', '=', 'failed')
    .execute();
}

/** When a server last took a mail; null: never. */
export async function lastAcceptedMs(reader: Reader): Promise<number | null> {
  const row = await reader
    .selectFrom('deliveries')
    .select('last_try_ms')
    .where('last_try_ms', 'is not', null)
    .where('state', '=', 'accepted')
    .orderBy('last_try_ms', 'desc')
    .limit(1)
    .executeTakeFirst();
  return row?.last_try_ms ?? null;
}

/** Deliveries refused for good since then. */
export async function countRefusedSince(reader: Reader, sinceMs: number): Promise<number> {
  const row = await reader
    .selectFrom('deliveries')
    .select(({ fn }) => fn.countAll<number>().as('count'))
    .where('state', '=', 'failed')
    .where('last_try_ms', '>=', sinceMs)
    .executeTakeFirstOrThrow();
  return row.count;
}
