import type { Severity } from '../config/site.ts';
import type { DeliveryState } from './deliveries.ts';
import type { Reader, Writer } from './lent-connection.ts';

/** One conversation a machine, from its first alarm until all are normal; machineId null: the site's own. */
export interface Thread {
  readonly id: number;
  readonly machineId: number | null;
  readonly openedMs: number;
  readonly subject: string;
  readonly severity: Severity;
}

export async function openThreadOf(reader: Reader, machineId: number | null): Promise<Thread | null> {
  const row = await reader
    .selectFrom('threads')
    .selectAll()
    .where('machine_id', machineId === null ? 'is' : '=', machineId)
    .where('closed_ms', 'is', null)
    .executeTakeFirst();
  if (row === undefined) return null;
  return {
    id: row.id,
    machineId: row.machine_id,
    openedMs: row.opened_ms,
    subject: row.subject,
    severity: row.severity as Severity,
  };
}

/** Throws where one is open already for that machine. */
export async function openThread(writer: Writer, thread: Omit<Thread, 'id'>): Promise<number> {
  const row = await writer
    .insertInto('threads')
    .values({
      machine_id: thread.machineId,
      opened_ms: thread.openedMs,
      closed_ms: null,
      subject: thread.subject,
      severity: thread.severity,
    })
    .returning('id')
    .executeTakeFirstOrThrow();
  return row.id;
}

/** The severity has risen: a new subject from here on. */
export async function changeThread(
  writer: Writer,
  id: number,
  to: { readonly subject: string; readonly severity: Severity },
): Promise<void> {
  await writer.updateTable('threads').set(to).where('id', '=', id).execute();
}

/** Closing twice keeps the first time. */
export async function closeThread(writer: Writer, id: number, closedMs: number): Promise<void> {
  await writer
    .updateTable('threads')
    .set({ closed_ms: closedMs })
    .where('id', '=', id)
    .where('closed_ms', 'is', null)
    .execute();
}

/** Subjects under which a thread's mails went out, newest first. */
export async function subjectsOfThread(reader: Reader, threadId: number, limit: number): Promise<string[]> {
  const rows = await reader
    .selectFrom('messages')
    .select('subject')
    .where('thread_id', '=', threadId)
    .orderBy('id', 'desc')
    .limit(limit)
    .execute();
  return rows.map(({ subject }) => subject);
}

/** Message-IDs that one recipient got in a thread, oldest first: for In-Reply-To (the last) and References. */
export async function mailIdsOfThread(
  reader: Reader,
  threadId: number,
  recipient: string,
  limit: number,
): Promise<string[]> {
  const rows = await reader
    .selectFrom('messages')
    .innerJoin('deliveries', 'deliveries.message_id', 'messages.id')
    .select('mail_id')
    .where('thread_id', '=', threadId)
    .where('recipient', '=', recipient)
    .orderBy('messages.id', 'desc')
    .limit(limit)
    .execute();
  return rows.map((row) => row.mail_id).reverse();
}

/** What `status` says of the outbox. */
export interface OutboxCounts {
  readonly deliveries: Readonly<Record<DeliveryState, number>>;
  /** Events not yet in a message. */
  readonly untold: number;
  /** When the oldest message that still waits was made; null when none waits. */
  readonly oldestWaitingMs: number | null;
  /** The mail server's last words, of whichever delivery was tried last. */
  readonly lastAnswer: {
    readonly triedMs: number;
    readonly answer: string;
    readonly state: DeliveryState;
  } | null;
}

export async function outboxCounts(reader: Reader): Promise<OutboxCounts> {
  const states = await reader
    .selectFrom('deliveries')
    .select(({ fn }) => ['state', fn.countAll<number>().as('count')])
    .groupBy('state')
    .orderBy('state')
    .execute();
  const deliveries: Record<DeliveryState, number> = { waiting: 0, accepted: 0, failed: 0, superseded: 0 };
  for (const row of states) deliveries[row.state as DeliveryState] = row.count;
  const untold = await reader
    .selectFrom('to_tell')
    .select(({ fn }) => fn.countAll<number>().as('count'))
    .where('message_id', 'is', null)
    .where('withdrawn_ms', 'is', null)
    .executeTakeFirstOrThrow();
  const oldest = await reader
    .selectFrom('deliveries')
    .innerJoin('messages', 'messages.id', 'deliveries.message_id')
    .select(({ fn }) => fn.min('messages.created_ms').as('createdMs'))
    .where('state', '=', 'waiting')
    .executeTakeFirst();
  const last = await reader
    .selectFrom('deliveries')
    .select(['last_try_ms', 'last_answer', 'state'])
    .where('last_try_ms', 'is not', null)
    .orderBy('last_try_ms', 'desc')
    .orderBy('mail_id', 'desc')
    .limit(1)
    .executeTakeFirst();
  return {
    deliveries,
    untold: untold.count,
    oldestWaitingMs: oldest?.createdMs ?? null,
    lastAnswer:
      last?.last_try_ms == null
        ? null
        : { triedMs: last.last_try_ms, answer: last.last_answer ?? '', state: last.state as DeliveryState },
  };
}
