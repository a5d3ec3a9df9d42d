import type { Severity } from '../config/site.ts';
import type { AlarmLife } from './alarms.ts';
import type { Reader } from './lent-connection.ts';

/** What came and went in a stretch of time, as the summary counts it. */

/** Recordings of a point with used times in (afterMs, toMs]. */
export async function countMeasured(
  reader: Reader,
  pointId: number,
  range: { readonly afterMs: number; readonly toMs: number },
): Promise<number> {
  const row = await reader
    .selectFrom('measurements')
    .select(({ fn }) => fn.countAll<number>().as('count'))
    .where('point_id', '=', pointId)
    .where('used_ms', '>', range.afterMs)
    .where('used_ms', '<=', range.toMs)
    .where('is_current', '=', 1)
    .executeTakeFirstOrThrow();
  return row.count;
}

/** Taken recordings that arrived since then: how many, how many of them late, their size. */
export async function arrivedSince(
  reader: Reader,
  sinceArrivedMs: number,
): Promise<{ readonly late: number; readonly bytes: number }> {
  const taken = reader
    .selectFrom('recordings')
    .where('outcome', '=', 'taken')
    .where('arrived_ms', '>=', sinceArrivedMs);
  const size = await taken
    .select(({ fn }) => fn.sum<number | null>('size_bytes').as('bytes'))
    .executeTakeFirstOrThrow();
  const late = await taken
    .select(({ fn }) => fn.countAll<number>().as('count'))
    .where('quality', 'like', '%"flag":"late"%')
    .executeTakeFirstOrThrow();
  return { late: late.count, bytes: size.bytes ?? 0 };
}

/** Evaluated recordings with used times in [fromMs, toMs] that arrived since then. */
export async function countEvaluated(
  reader: Reader,
  range: { readonly sinceArrivedMs: number; readonly fromMs: number; readonly toMs: number },
): Promise<number> {
  const row = await reader
    .selectFrom('recordings')
    .select(({ fn }) => fn.countAll<number>().as('count'))
    .where('outcome', '=', 'taken')
    .where('arrived_ms', '>=', range.sinceArrivedMs)
    .where('used_ms', '>=', range.fromMs)
    .where('used_ms', '<=', range.toMs)
    .where('evaluated', '=', 1)
    .executeTakeFirstOrThrow();
  return row.count;
}

/**
 * Wall time since when each life asks for a response: its first telling, or the first one after the acknowledgement
 * that it outgrew. A danger told while its alert waits for a person takes over that alert's time; one that comes after
 * somebody had the alert in hand asks anew. A life that nobody was told of is not in the answer.
 */
export async function askedSinceMs(reader: Reader, numbers: readonly number[]): Promise<Map<number, number>> {
  const asked = new Map<number, number>();
  for (let from = 0; from < numbers.length; from += 500) {
    const some = numbers.slice(from, from + 500);
    const tellings = await reader
      .selectFrom('to_tell')
      .select(['number', 'journal_sequence as sequence', 'wall_ms as wallMs'])
      .where('number', 'in', some)
      .orderBy('id')
      .execute();
    const acknowledged = await reader
      .selectFrom('journal')
      .select(['number', 'sequence'])
      .where('number', 'in', some)
      .where('event', '=', 'acknowledged')
      .orderBy('sequence')
      .execute();
    for (const number of some) {
      const told = tellings.filter((one) => one.number === number);
      const newest = told.at(-1)?.sequence ?? 0;
      const answered = acknowledged.findLast((one) => one.number === number && one.sequence < newest);
      const first = told.find(({ sequence }) => sequence > (answered?.sequence ?? 0));
      if (first !== undefined) asked.set(number, first.wallMs);
    }
  }
  return asked;
}

/** Lives that ended since then by the wall clock, oldest number first. */
export async function livesEndedSince(reader: Reader, sinceMs: number): Promise<AlarmLife[]> {
  const rows = await reader
    .selectFrom('alarms')
    .selectAll()
    .where('ended_wall_ms', '>=', sinceMs)
    .orderBy('number')
    .limit(1000)
    .execute();
  return rows.map((row) => ({
    number: row.number,
    key: row.key,
    severity: row.severity as Severity,
    raisedUsedMs: row.raised_used_ms,
    raisedWallMs: row.raised_wall_ms,
    endedWallMs: row.ended_wall_ms,
    acknowledgedWallMs: row.acknowledged_wall_ms,
    acknowledgedBy: row.acknowledged_by,
  }));
}
