import type { ChatterFacts } from '../advisory/history-words.ts';
import type { Limit } from '../config/site.ts';
import type { AlarmChange } from '../detection/alarm.ts';
import {
  type Chatter,
  chatteringRecordings,
  chatteringReturns,
  chatterOf,
  chatterReason,
  type PastEvent,
} from '../detection/alarm-history.ts';
import type { StoredAlarm } from '../store/alarms.ts';
import type { Reader } from '../store/lent-connection.ts';

/** From what the journal says beside 'raised', and the limit as it is now. */
export function chatterFacts(said: unknown, limit: Limit | undefined): ChatterFacts | null {
  if (typeof said !== 'object' || said === null) return null;
  const { returns, recordings } = said as Record<string, unknown>;
  if (typeof returns !== 'number' || typeof recordings !== 'number') return null;
  const { deadbandPercent = null, onDelay = null } = limit ?? {};
  return { returns, recordings, deadbandPercent, onDelay };
}

/**
 * Which of these alarms come and go, by key. `besides`: recordings that are being judged and are not in the ledger yet.
 */
export async function chatteringAlarms(
  reader: Reader,
  alarms: Iterable<Pick<StoredAlarm, 'key' | 'pointId' | 'number'>>,
  besides = 0,
): Promise<Map<string, Chatter>> {
  const found = new Map<string, Chatter>();
  const from = new Map<number, number>();
  for (const { key, pointId, number } of alarms) {
    if (pointId === null || number === null) continue;
    const returned = await newestOf(reader, key, 'returned', chatteringRecordings);
    if (returned.length < chatteringReturns) continue;
    const fromMs =
      from.get(pointId) ?? (await oldestThatCounts(reader, pointId, chatteringRecordings - besides));
    from.set(pointId, fromMs);
    if (chatterOf(returned, fromMs) === null) continue;
    const chatter = chatterOf([...returned, ...(await newestOf(reader, key, 'raised', 1))], fromMs);
    if (chatter !== null) found.set(key, chatter);
  }
  return found;
}

/** Of one alarm: the newest rows of one event, without going through the others. */
async function newestOf(
  reader: Reader,
  key: string,
  event: 'raised' | 'returned',
  limit: number,
): Promise<PastEvent[]> {
  const rows = await reader
    .selectFrom('journal')
    .select(['used_ms', 'reason'])
    .where('key', '=', key)
    .where('event', '=', event)
    .orderBy('sequence', 'desc')
    .limit(limit)
    .execute();
  return rows.map(({ used_ms, reason }) => ({
    event,
    usedMs: used_ms,
    reason: event === 'raised' ? (JSON.parse(reason) as PastEvent['reason']) : {},
  }));
}

/** Used time of the point's nth newest recording of the running machine; before all time where there are fewer. */
async function oldestThatCounts(reader: Reader, pointId: number, nth: number): Promise<number> {
  const row = await reader
    .selectFrom('measurements')
    .select('used_ms')
    .where('point_id', '=', pointId)
    .where('evaluated', '=', 1)
    .where('machine_state', '=', 'running')
    .orderBy('used_ms', 'desc')
    .offset(nth - 1)
    .limit(1)
    .executeTakeFirst();
  return row?.used_ms ?? Number.NEGATIVE_INFINITY;
}

/** Of one alarm, whether it comes and goes by now. */
export async function chatterFactsNow(
  reader: Reader,
  alarm: StoredAlarm,
  limit: Limit | undefined,
): Promise<ChatterFacts | null> {
  const chatter = (await chatteringAlarms(reader, [alarm])).get(alarm.key);
  return chatter === undefined ? null : chatterFacts(chatterReason(chatter).chattering, limit);
}

/** The event that is told as chattering says so, in the journal and from there in the mail. */
export function saidAsChattering(change: AlarmChange, chatter: Chatter | undefined): AlarmChange {
  if (chatter === undefined || change.subject.kind !== 'limit') return change;
  const journal = change.journal.map((row) =>
    row.event === 'raised' ? { ...row, reason: { ...row.reason, ...chatterReason(chatter) } } : row,
  );
  return { ...change, journal };
}
