import type { DeliveryState } from './deliveries.ts';
import { newestSequence, readJournal } from './journal.ts';
import type { Reader } from './lent-connection.ts';
import { recentByOutcome, type StoredRecording } from './recordings.ts';

/** What the ledger says of the service and its mail, for whoever looks at it from outside. */

/** The answer of the newest attempt to deliver a mail. */
export interface LastMailAnswer {
  readonly recipient: string;
  readonly triedMs: number;
  readonly answer: string;
  readonly state: DeliveryState;
}

export async function lastMailAnswer(reader: Reader): Promise<LastMailAnswer | null> {
  const row = await reader
    .selectFrom('deliveries')
    .select(['recipient', 'last_try_ms', 'last_answer', 'state'])
    .where('last_try_ms', 'is not', null)
    .orderBy('last_try_ms', 'desc')
    .orderBy('mail_id', 'desc')
    .limit(1)
    .executeTakeFirst();
  if (row?.last_try_ms == null) return null;
  return {
    recipient: row.recipient,
    triedMs: row.last_try_ms,
    answer: row.last_answer ?? '',
    state: row.state as DeliveryState,
  };
}

/** Events decided on that are in no message yet: they are being gathered. */
export async function countUntold(reader: Reader): Promise<number> {
  const row = await reader
    .selectFrom('to_tell')
    .select(({ fn }) => fn.countAll<number>().as('count'))
    .where('message_id', 'is', null)
    .where('withdrawn_ms', 'is', null)
    .executeTakeFirstOrThrow();
  return row.count;
}

/** The taken recording that arrived last. */
export async function newestTaken(reader: Reader): Promise<StoredRecording | null> {
  return (await recentByOutcome(reader, 'taken', 1))[0] ?? null;
}

const rowsAtOnce = 200;
/** Rows that are looked through for the newest start of a service. */
const mostRows = 20_000;

/** Wall time at which the service last began; null where it never did, or longer ago than the journal is searched. */
export async function lastStartedMs(reader: Reader): Promise<number | null> {
  const newest = await newestSequence(reader);
  for (let before = newest + 1; before > 1 && before > newest - mostRows; ) {
    const rows = await readJournal(reader, { beforeSequence: before, limit: rowsAtOnce });
    const started = rows.find(({ event }) => event === 'started');
    if (started !== undefined) return started.wallMs;
    before = rows.at(-1)?.sequence ?? 0;
  }
  return null;
}
