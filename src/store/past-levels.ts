import { sql } from 'kysely';
import type { Reader } from './lent-connection.ts';

/** A level of the trend without its interval: what changes are reckoned from. SI r.m.s. */
export interface BareLevel {
  readonly usedMs: number;
  readonly bandId: number;
  readonly seriesId: number;
  readonly conditionId: number;
  readonly level: number;
}

/**
 * Levels of all bands of a point in [fromMs, toMs), oldest first. Where more than `mostTimes` recordings are expected
 * in that range (one every `everyMs`), only each n-th interval is read, so that a logger that sends every minute costs
 * no more than one that sends every hour.
 */
export async function bareLevels(
  reader: Reader,
  range: {
    readonly pointId: number;
    readonly fromMs: number;
    readonly toMs: number;
    readonly everyMs: number;
    readonly mostTimes: number;
  },
): Promise<BareLevel[]> {
  const everyMs = Math.max(1, Math.round(range.everyMs));
  const nth = Math.ceil((range.toMs - range.fromMs) / everyMs / range.mostTimes);
  let query = reader
    .selectFrom('levels')
    .select([
      'used_ms as usedMs',
      'band_id as bandId',
      'series_id as seriesId',
      'condition_id as conditionId',
      'level',
    ])
    .where('point_id', '=', range.pointId)
    .where('used_ms', '>=', range.fromMs)
    .where('used_ms', '<', range.toMs)
    .where('in_trend', '=', 1);
  if (nth > 1) query = query.where(sql<boolean>`(used_ms / ${everyMs}) % ${nth} = 0`);
  return query.orderBy('used_ms').orderBy('band_id').orderBy('series_id').execute();
}

/** The measurement behind the newest level of a point's trend that is not older than `fromMs`; null: there is none. */
export async function newestInTrend(reader: Reader, pointId: number, fromMs: number): Promise<number | null> {
  const row = await reader
    .selectFrom('levels')
    .select('measurement_id')
    .where('point_id', '=', pointId)
    .where('used_ms', '>=', fromMs)
    .where('in_trend', '=', 1)
    .orderBy('used_ms', 'desc')
    .limit(1)
    .executeTakeFirst();
  return row?.measurement_id ?? null;
}

/** The highest level of a band with used times in [fromMs, toMs]; null where there is none. SI r.m.s. */
export async function highestLevel(
  reader: Reader,
  range: {
    readonly pointId: number;
    readonly bandId: number;
    readonly fromMs: number;
    readonly toMs: number;
  },
): Promise<number | null> {
  const row = await reader
    .selectFrom('levels')
    .select(({ fn }) => fn.max('level').as('highest'))
    .where('point_id', '=', range.pointId)
    .where('used_ms', '>=', range.fromMs)
    .where('used_ms', '<=', range.toMs)
    .where('band_id', '=', range.bandId)
    .executeTakeFirst();
  return row?.highest ?? null;
}

/** The newest measurement with a spectrum's peaks, taken while the machine ran, with its used time in [fromMs, toMs). */
export async function peaksBetween(
  reader: Reader,
  pointId: number,
  range: { readonly fromMs: number; readonly toMs: number },
): Promise<{
  readonly measurementId: number;
  readonly usedMs: number;
  readonly lineSpacingHz: number;
} | null> {
  const row = await reader
    .selectFrom('measurements')
    .select(['id', 'used_ms', 'line_spacing_hz'])
    .where('point_id', '=', pointId)
    .where('used_ms', '>=', range.fromMs)
    .where('used_ms', '<', range.toMs)
    .where('is_current', '=', 1)
    .where('machine_state', '=', 'running')
    .where('line_spacing_hz', 'is not', null)
    .orderBy('used_ms', 'desc')
    .orderBy('id', 'desc')
    .limit(1)
    .executeTakeFirst();
  if (row === undefined || row.line_spacing_hz === null) return null;
  return { measurementId: row.id, usedMs: row.used_ms, lineSpacingHz: row.line_spacing_hz };
}

/** Used time of the newest unflagged recording of a point before a time; null where there is none. */
export async function lastUnflaggedMs(
  reader: Reader,
  pointId: number,
  beforeMs: number,
): Promise<number | null> {
  const row = await reader
    .selectFrom('measurements')
    .select('used_ms')
    .where('point_id', '=', pointId)
    .where('used_ms', '<', beforeMs)
    .where('quality', '=', '[]')
    .orderBy('used_ms', 'desc')
    .limit(1)
    .executeTakeFirst();
  return row?.used_ms ?? null;
}

/** The band that a limit guards or, retired, guarded. */
export async function bandOfLimit(reader: Reader, limitId: number): Promise<number | null> {
  const row = await reader
    .selectFrom('limits')
    .select('band_id')
    .where('id', '=', limitId)
    .executeTakeFirst();
  return row?.band_id ?? null;
}
