import type { Ledger } from './ledger.ts';
import type { Reader } from './lent-connection.ts';

/**
 * What mails and summaries said is emptied when nobody asks for it any more: the rows stay, with recipient, times and the
 * server's answer. In slices, as thinning goes.
 */
const mailsASlice = 50;
const summariesASlice = 20;

export interface OldMailRule {
  /** Mails over and done with before this time. */
  readonly mailBeforeMs: number;
  /** Summaries made before this time; they lie in the data folder as files. */
  readonly summaryBeforeMs: number;
}

/** `between` is awaited between two slices. Returns how many mails and summaries were emptied. */
export async function emptyOldMail(
  ledger: Ledger,
  rule: OldMailRule,
  between: () => Promise<void> = async () => {},
): Promise<number> {
  let emptied = 0;
  for (let found = mailsASlice; found === mailsASlice; emptied += found) {
    const ids = await ledger.read((reader) => oldMails(reader, rule.mailBeforeMs));
    found = ids.length;
    if (found === 0) break;
    await ledger.transact((writer) =>
      writer
        .updateTable('deliveries')
        .set({ bytes: new Uint8Array() })
        .where('mail_id', 'in', ids)
        .where('state', '!=', 'waiting')
        .execute(),
    );
    await between();
  }
  for (let found = summariesASlice; found === summariesASlice; emptied += found) {
    const dates = await ledger.read((reader) => oldSummaries(reader, rule.summaryBeforeMs));
    found = dates.length;
    if (found === 0) break;
    await ledger.transact((writer) =>
      writer.updateTable('summaries').set({ html: '' }).where('local_date', 'in', dates).execute(),
    );
    await between();
  }
  return emptied;
}

async function oldMails(reader: Reader, beforeMs: number): Promise<string[]> {
  const rows = await reader
    .selectFrom('deliveries')
    .innerJoin('messages', 'messages.id', 'deliveries.message_id')
    .select('mail_id')
    .where('state', 'in', ['accepted', 'failed', 'superseded'])
    // What was superseded may never have been tried.
    .where(({ fn }) => fn.coalesce('last_try_ms', 'created_ms'), '<', beforeMs)
    .where(({ fn }) => fn<number>('length', ['bytes']), '>', 0)
    .limit(mailsASlice)
    .execute();
  return rows.map((row) => row.mail_id);
}

async function oldSummaries(reader: Reader, beforeMs: number): Promise<string[]> {
  const rows = await reader
    .selectFrom('summaries')
    .select('local_date')
    .where('created_ms', '<', beforeMs)
    .where('html', '!=', '')
    .limit(summariesASlice)
    .execute();
  return rows.map((row) => row.local_date);
}
