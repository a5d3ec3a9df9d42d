import type { Severity } from '../config/site.ts';
import type { Reader } from './lent-connection.ts';

/** An alarm of a limit as it came: from raised to normal again. Used times. */
export interface PastAlarm {
  /** As the alarm is called now. */
  readonly key: string;
  readonly raisedMs: number;
  /** Null: it still stood. */
  readonly returnedMs: number | null;
  /** The highest it had. */
  readonly severity: Severity;
  /** It had come and gone so often that it was told as chattering. */
  readonly chattering: boolean;
}

const rowsAtOnce = 20_000;

/**
 * Alarms of limits that were raised in [fromMs, toMs), in the order of the journal. What was raised before and returned
 * within is not among them.
 */
export async function pastAlarms(
  reader: Reader,
  range: { readonly fromMs: number; readonly toMs: number },
): Promise<PastAlarm[]> {
  const alarms: PastAlarm[] = [];
  const open = new Map<string, number>();
  for (let after = 0; ; ) {
    const rows = await journalPage(reader, range, after);
    for (const row of rows) {
      after = row.sequence;
      const { key, event, usedMs } = row;
      const at = open.get(key);
      const standing = at === undefined ? undefined : alarms[at];
      const severity = row.after as Severity;
      if (event === 'raised' && usedMs !== null) {
        const chattering = (JSON.parse(row.reason) as { chattering?: unknown }).chattering != null;
        open.set(key, alarms.length);
        alarms.push({ key, raisedMs: usedMs, returnedMs: null, severity, chattering });
      } else if (standing !== undefined && at !== undefined) {
        if (event === 'rose') alarms[at] = { ...standing, severity };
        else {
          alarms[at] = { ...standing, returnedMs: usedMs };
          open.delete(key);
        }
      }
    }
    if (rows.length < rowsAtOnce) return alarms;
  }
}

function journalPage(
  reader: Reader,
  { fromMs, toMs }: { readonly fromMs: number; readonly toMs: number },
  after: number,
) {
  return (
    reader
      .selectFrom('journal')
      // The journal keeps the key that it had; its life goes by the one that it has now.
      .innerJoin('alarms', 'alarms.number', 'journal.number')
      .select([
        'journal.sequence',
        'alarms.key',
        'journal.event',
        'journal.after',
        'journal.used_ms as usedMs',
        'journal.reason',
      ])
      .where('journal.sequence', '>', after)
      .where('journal.event', 'in', ['raised', 'rose', 'returned', 'limit-removed'])
      .where('journal.used_ms', '>=', fromMs)
      .where('journal.used_ms', '<', toMs)
      .where('alarms.key', 'like', 'limit:%')
      .orderBy('journal.sequence')
      .limit(rowsAtOnce)
      .execute()
  );
}
