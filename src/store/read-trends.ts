import type { Selectable } from 'kysely';
import type { Quantity } from '../config/site.ts';
import type { SpectralPeak } from '../manipulation/measurement.ts';
import type { Reader } from './lent-connection.ts';
import { storedPeak } from './peaks.ts';
import type { LevelsTable } from './schema.ts';

/** One level of the past. SI r.m.s. */
export interface TrendPoint {
  readonly usedMs: number;
  readonly bandId: number;
  readonly seriesId: number;
  readonly measurementId: number;
  readonly level: number;
  readonly intervalLow: number;
  readonly intervalHigh: number;
  readonly exceededBy80Percent: number | null;
  readonly atLeast: boolean;
  readonly conditionId: number;
  readonly inTrend: boolean;
}

export interface TrendRange {
  readonly pointId: number;
  /** One band; without it all bands of the point. */
  readonly bandId?: number;
  readonly seriesId?: number;
  readonly conditionId?: number;
  /** Used time from and including. */
  readonly fromMs: number;
  /** Up to, not including. */
  readonly toMs: number;
  /** Also what was measured while stopped or transient, and twins. */
  readonly outOfTrendToo?: boolean;
  /** Rows at most; the newest are kept. */
  readonly limit: number;
}

/** Levels in the order of used time, band, series; where there are more than `limit`, the newest ones. */
export async function readLevels(reader: Reader, range: TrendRange): Promise<TrendPoint[]> {
  let query = reader
    .selectFrom('levels')
    .selectAll()
    .where('point_id', '=', range.pointId)
    .where('used_ms', '>=', range.fromMs)
    .where('used_ms', '<', range.toMs);
  if (range.bandId !== undefined) query = query.where('band_id', '=', range.bandId);
  if (range.seriesId !== undefined) query = query.where('series_id', '=', range.seriesId);
  if (range.conditionId !== undefined) query = query.where('condition_id', '=', range.conditionId);
  if (range.outOfTrendToo !== true) query = query.where('in_trend', '=', 1);
  const rows = await query
    .orderBy('used_ms', 'desc')
    .orderBy('band_id', 'desc')
    .orderBy('series_id', 'desc')
    .limit(range.limit)
    .execute();
  return rows.map(trendPoint).reverse();
}

/** A series: the levels of one band under one fingerprint of settings. */
export interface Series {
  readonly id: number;
  readonly bandId: number;
  readonly fingerprint: string;
  readonly quantity: Quantity;
  readonly fromHz: number;
  readonly toHz: number;
  readonly beganMs: number;
}

/** All series of a point, first begun first. */
export async function seriesOfPoint(reader: Reader, pointId: number): Promise<Series[]> {
  const rows = await reader
    .selectFrom('series')
    .selectAll()
    .where('point_id', '=', pointId)
    .orderBy('began_ms')
    .orderBy('id')
    .execute();
  return rows.map((row) => ({
    id: row.id,
    bandId: row.band_id,
    fingerprint: row.fingerprint,
    quantity: row.quantity as Quantity,
    fromHz: row.from_hz,
    toHz: row.to_hz,
    beganMs: row.began_ms,
  }));
}

/** Strongest first, as they were stored. */
export async function peaksOf(reader: Reader, measurementId: number): Promise<SpectralPeak[]> {
  const rows = await reader
    .selectFrom('peaks')
    .selectAll()
    .where('measurement_id', '=', measurementId)
    .orderBy('rank')
    .execute();
  return rows.map(storedPeak);
}

export function trendPoint(row: Selectable<LevelsTable>): TrendPoint {
  return {
    usedMs: row.used_ms,
    bandId: row.band_id,
    seriesId: row.series_id,
    measurementId: row.measurement_id,
    level: row.level,
    intervalLow: row.interval_low,
    intervalHigh: row.interval_high,
    exceededBy80Percent: row.exceeded_by_80_percent,
    atLeast: row.at_least === 1,
    conditionId: row.condition_id,
    inTrend: row.in_trend === 1,
  };
}
