import { sql } from 'kysely';
import type { Reader } from './lent-connection.ts';

/**
 * A long time of one point, read in pages: its measurements, then the levels within the page's time. Whoever works
 * through years keeps columns of his own; nothing here holds a cursor.
 */
export interface PastMeasurement {
  readonly id: number;
  readonly usedMs: number;
  /** 1: the machine ran, and was not starting. */
  readonly runs: number;
  readonly evaluated: number;
  /** 1: in none of its operating conditions of that day, or not running. */
  readonly outside: number;
  readonly speedRpm: number | null;
  /** 1: the speed is the nominal one. */
  readonly nominal: number | null;
  readonly loadPercent: number | null;
  readonly averages: number | null;
  readonly pooledRecordings: number | null;
  /** JSON lists of findings, its own and those of the recording; null: none. Texts are what takes time here. */
  readonly quality: string | null;
  readonly recordingQuality: string | null;
}

/** Current measurements of a point in [fromMs, toMs), oldest first, at most `limit`. */
export async function pastMeasurements(
  reader: Reader,
  page: {
    readonly pointId: number;
    readonly fromMs: number;
    readonly toMs: number;
    readonly limit: number;
  },
): Promise<PastMeasurement[]> {
  return reader
    .selectFrom('measurements as m')
    .innerJoin('recordings as r', 'r.id', 'm.recording_id')
    .select([
      'm.id',
      'm.used_ms as usedMs',
      sql<number>`m.machine_state = 'running'`.as('runs'),
      'm.evaluated',
      sql<number>`m.condition is null`.as('outside'),
      'm.speed_rpm as speedRpm',
      sql<number | null>`m.speed_origin = 'nominal'`.as('nominal'),
      'm.load_percent as loadPercent',
      'm.averages',
      'm.pooled_recordings as pooledRecordings',
      sql<string | null>`nullif(m.quality, '[]')`.as('quality'),
      sql<string | null>`nullif(r.quality, '[]')`.as('recordingQuality'),
    ])
    .where('m.point_id', '=', page.pointId)
    .where('m.used_ms', '>=', page.fromMs)
    .where('m.used_ms', '<', page.toMs)
    .where('m.is_current', '=', 1)
    .orderBy('m.used_ms')
    .orderBy('m.id')
    .limit(page.limit)
    .execute();
}

/** A level as it is read by the ten thousand. SI r.m.s. */
export interface PlainLevel {
  readonly measurementId: number;
  readonly seriesId: number;
  readonly level: number;
  /** 1: at least so high; 2: in the trend; 3: both. */
  readonly marks: number;
  readonly exceeded?: number | null;
  readonly intervalLow?: number;
  readonly intervalHigh?: number;
}

/**
 * Levels of a point with used times in [fromMs, toMs), by time; the interval and what 80 % exceed only where asked for. Of
 * all bands: they lie beside each other, and to sort them out here takes longer than to read them.
 */
export async function pastLevels(
  reader: Reader,
  range: {
    readonly pointId: number;
    readonly fromMs: number;
    readonly toMs: number;
    readonly exceeded: boolean;
    readonly intervals: boolean;
  },
): Promise<PlainLevel[]> {
  let query = reader
    .selectFrom('levels')
    .select([
      'measurement_id as measurementId',
      'series_id as seriesId',
      'level',
      sql<number>`at_least + 2 * in_trend`.as('marks'),
    ])
    .where('point_id', '=', range.pointId)
    .where('used_ms', '>=', range.fromMs)
    .where('used_ms', '<', range.toMs);
  if (range.exceeded) query = query.select('exceeded_by_80_percent as exceeded');
  if (range.intervals) query = query.select(['interval_low as intervalLow', 'interval_high as intervalHigh']);
  return (await query.orderBy('used_ms').orderBy('band_id').orderBy('series_id').execute()) as PlainLevel[];
}

/** Used times of the first level and of the newest recording that the ledger has; null: it has none. */
export async function timeOfLevels(
  reader: Reader,
): Promise<{ readonly firstMs: number; readonly newestMs: number } | null> {
  const first = await reader
    .selectFrom('series')
    .select(({ fn }) => fn.min('began_ms').as('ms'))
    .executeTakeFirst();
  const newest = await reader
    .selectFrom('point_arrivals')
    .select(({ fn }) => fn.max('newest_used_ms').as('ms'))
    .executeTakeFirst();
  if (first?.ms == null || newest?.ms == null) return null;
  return { firstMs: first.ms, newestMs: newest.ms };
}
