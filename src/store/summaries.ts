import type { Selectable, SelectQueryBuilder } from 'kysely';
import type { Reader, Writer } from './lent-connection.ts';
import type { LedgerTables } from './schema.ts';

type Row = LedgerTables['summaries'];

/** The summary of one local date. `facts`: JSON of what it said. */
export interface StoredSummary {
  /** YYYY-MM-DD in the site's zone. */
  readonly localDate: string;
  readonly createdMs: number;
  readonly messageId: number | null;
  readonly html: string;
  readonly facts: string;
}

/** One a local date: false, and nothing is changed, where that day has its summary. */
export async function keepSummary(writer: Writer, summary: StoredSummary): Promise<boolean> {
  const rows = await writer
    .insertInto('summaries')
    .values({
      local_date: summary.localDate,
      created_ms: summary.createdMs,
      message_id: summary.messageId,
      html: summary.html,
      facts: summary.facts,
    })
    .onConflict((conflict) => conflict.column('local_date').doNothing())
    .returning('local_date')
    .execute();
  return rows.length === 1;
}

/** The summary of that date, or without one the last. */
export async function readSummary(reader: Reader, localDate?: string): Promise<StoredSummary | null> {
  let query = reader.selectFrom('summaries').selectAll();
  if (localDate !== undefined) query = query.where('local_date', '=', localDate);
  return newest(query);
}

/** The last summary up to a date; one of a day to come was made while the clock was wrong. */
export function lastSummary(reader: Reader, upToLocalDate: string): Promise<StoredSummary | null> {
  return newest(reader.selectFrom('summaries').selectAll().where('local_date', '<=', upToLocalDate));
}

async function newest(query: SelectQueryBuilder<LedgerTables, 'summaries', Selectable<Row>>) {
  const row = await query.orderBy('local_date', 'desc').limit(1).executeTakeFirst();
  if (row === undefined) return null;
  return {
    localDate: row.local_date,
    createdMs: row.created_ms,
    messageId: row.message_id,
    html: row.html,
    facts: row.facts,
  };
}
