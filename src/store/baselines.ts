import type { Selectable } from 'kysely';
import type { Baseline, BaselineState, GoodLevel } from '../detection/baseline.ts';
import type { BaselinesTable } from './baseline-tables.ts';
import type { DayOf } from './daily-levels.ts';
import type { Reader, Writer } from './lent-connection.ts';

/** What a baseline belongs to. */
export interface BaselineKey {
  readonly seriesId: number;
  readonly conditionId: number;
}

export interface StoredBaseline extends Baseline, BaselineKey {
  /** Readings before this used time take no part. */
  readonly learnFromMs: number;
}

/** Baselines of one series, or of some, in the order of series and condition. */
export async function baselinesOf(reader: Reader, seriesIds: readonly number[]): Promise<StoredBaseline[]> {
  if (seriesIds.length === 0) return [];
  const rows = await reader
    .selectFrom('baselines')
    .selectAll()
    .where('series_id', 'in', seriesIds)
    .orderBy('series_id')
    .orderBy('condition_id')
    .execute();
  return rows.map(storedBaseline);
}

export async function saveBaseline(writer: Writer, baseline: StoredBaseline): Promise<void> {
  const values = {
    state: baseline.state,
    learn_from_ms: Math.round(baseline.learnFromMs),
    from_ms: baseline.fromMs,
    to_ms: baseline.toMs,
    running_days: baseline.runningDays,
    recordings: baseline.recordings,
    median_log: baseline.medianLog,
    spread_log: baseline.spreadLog,
    refused: baseline.refused,
    confirmed_by: baseline.confirmed?.by ?? null,
    confirm_comment: baseline.confirmed?.comment ?? null,
  };
  await writer
    .insertInto('baselines')
    .values({ series_id: baseline.seriesId, condition_id: baseline.conditionId, ...values })
    .onConflict((conflict) => conflict.columns(['series_id', 'condition_id']).doUpdateSet(values))
    .execute();
}

/** Good levels of a series in one condition from a used time on, oldest first: in the trend, of unflagged recordings. */
export async function goodLevels(
  reader: Reader,
  key: BaselineKey & { readonly pointId: number; readonly bandId: number; readonly fromMs: number },
  limits: { readonly dayOf: DayOf; readonly mostDays: number },
): Promise<GoodLevel[]> {
  const rows = await reader
    .selectFrom('levels')
    .innerJoin('measurements', 'measurements.id', 'levels.measurement_id')
    .select(['levels.used_ms', 'levels.level'])
    .where('levels.point_id', '=', key.pointId)
    .where('levels.used_ms', '>=', key.fromMs)
    .where('levels.band_id', '=', key.bandId)
    .where('levels.series_id', '=', key.seriesId)
    .where('levels.condition_id', '=', key.conditionId)
    .where('levels.in_trend', '=', 1)
    .where('levels.at_least', '=', 0)
    .where('measurements.quality', '=', '[]')
    .orderBy('levels.used_ms')
    .execute();
  const levels = rows.map((row) => ({
    usedMs: row.used_ms,
    day: limits.dayOf(row.used_ms),
    level: row.level,
  }));
  const days = [...new Set(levels.map(({ day }) => day))];
  const last = days[limits.mostDays - 1] ?? Number.POSITIVE_INFINITY;
  return levels.filter(({ day }) => day <= last);
}

function storedBaseline(row: Selectable<BaselinesTable>): StoredBaseline {
  return {
    seriesId: row.series_id,
    conditionId: row.condition_id,
    state: row.state as BaselineState,
    learnFromMs: row.learn_from_ms,
    fromMs: row.from_ms,
    toMs: row.to_ms,
    runningDays: row.running_days,
    recordings: row.recordings,
    medianLog: row.median_log,
    spreadLog: row.spread_log,
    refused: row.refused,
    confirmed:
      row.confirmed_by === null ? null : { by: row.confirmed_by, comment: row.confirm_comment ?? '' },
  };
}
