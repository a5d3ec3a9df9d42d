import type { Reader, Writer } from './lent-connection.ts';

/** Times of the wall clock, as detection of floods needs them. */
export interface StoredFlood {
  readonly id: number;
  readonly fromMs: number;
  readonly begunMs: number;
  readonly endedMs: number | null;
}

/** Journal entries about floods, and the event that one has ended, are no alarms. */
const ofFloods = 'flood-ended';

/**
 * Alarms (several events of one count once) that came in (afterMs, toMs] and in no backlog, and when the first did; null:
 * none came.
 */
export async function alarmsArrived(
  reader: Reader,
  range: { readonly afterMs: number; readonly toMs: number },
): Promise<{ readonly count: number; readonly firstMs: number | null }> {
  const row = await reader
    .selectFrom('to_tell')
    .select(({ fn }) => [
      fn.count<number>(fn.coalesce('key', 'identity')).distinct().as('count'),
      fn.min('wall_ms').as('firstMs'),
    ])
    .where('wall_ms', '>', range.afterMs)
    .where('wall_ms', '<=', range.toMs)
    .where('from_backlog', '=', 0)
    .where('withdrawn_ms', 'is', null)
    .where('event', '!=', ofFloods)
    .executeTakeFirstOrThrow();
  return { count: row.count, firstMs: row.firstMs };
}

export async function standingFlood(reader: Reader): Promise<StoredFlood | null> {
  const row = await reader.selectFrom('floods').selectAll().where('ended_ms', 'is', null).executeTakeFirst();
  return row === undefined ? null : storedFlood(row);
}

/** Those that ended at or after `sinceMs`, oldest first, and the one that stands. */
export async function floodsSince(reader: Reader, sinceMs: number): Promise<StoredFlood[]> {
  const ended = await reader
    .selectFrom('floods')
    .selectAll()
    .where('ended_ms', '>=', sinceMs)
    .orderBy('ended_ms')
    .execute();
  const standing = await standingFlood(reader);
  return [...ended.map(storedFlood), ...(standing === null ? [] : [standing])];
}

export async function beginFlood(
  writer: Writer,
  flood: { readonly fromMs: number; readonly begunMs: number },
): Promise<number> {
  const row = await writer
    .insertInto('floods')
    .values({ from_ms: flood.fromMs, begun_ms: flood.begunMs, ended_ms: null })
    .returning('id')
    .executeTakeFirstOrThrow();
  return row.id;
}

export async function endFlood(writer: Writer, id: number, endedMs: number): Promise<void> {
  await writer
    .updateTable('floods')
    .set({ ended_ms: endedMs })
    .where('id', '=', id)
    .where('ended_ms', 'is', null)
    .execute();
}

/** Message-IDs of one group (a flood) that each recipient got, oldest first. */
export async function mailIdsOfGroup(reader: Reader, groupKey: string): Promise<Map<string, string[]>> {
  const rows = await reader
    .selectFrom('messages')
    .innerJoin('deliveries', 'deliveries.message_id', 'messages.id')
    .select(['recipient', 'mail_id'])
    .where('group_key', '=', groupKey)
    .orderBy('messages.id')
    .execute();
  const byRecipient = new Map<string, string[]>();
  for (const row of rows)
    byRecipient.set(row.recipient, [...(byRecipient.get(row.recipient) ?? []), row.mail_id]);
  return byRecipient;
}

/** Whether any mail of that group was made. */
export async function hasMessages(reader: Reader, groupKey: string): Promise<boolean> {
  const row = await reader
    .selectFrom('messages')
    .select('id')
    .where('group_key', '=', groupKey)
    .limit(1)
    .executeTakeFirst();
  return row !== undefined;
}

function storedFlood(row: {
  readonly id: number;
  readonly from_ms: number;
  readonly begun_ms: number;
  readonly ended_ms: number | null;
}): StoredFlood {
  return { id: row.id, fromMs: row.from_ms, begunMs: row.begun_ms, endedMs: row.ended_ms };
}
