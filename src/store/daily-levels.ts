import { sql } from 'kysely';
import type { DailyLevelsTable } from './baseline-tables.ts';
import type { Reader, Writer } from './lent-connection.ts';
import { insertRows } from './many-rows.ts';

/**
 * Levels by the day: least, median, greatest of each band's trend in one series and operating condition. Trends,
 * baselines and the years of a chart are read from here. A day is reckoned when a recording of a later day
 * is decided, in the same transaction; a day into which a late recording falls is reckoned anew.
 */

/** Local day of a used time: days since 1970-01-01 of the date that the site's clocks show. */
export type DayOf = (usedMs: number) => number;

const hour = 3_600_000;
/** A local day has at most 25 hours and lies within this of any of its times. */
const reachMs = 26 * hour;

/**
 * To be called with each recording of a point once its levels are stored. Returns the day that was reckoned, null where
 * the point's newest day goes on.
 */
export async function keepDailyLevels(
  writer: Writer,
  pointId: number,
  usedMs: number,
  dayOf: DayOf,
): Promise<number | null> {
  const mark = await writer
    .selectFrom('day_marks')
    .select('used_ms')
    .where('point_id', '=', pointId)
    .executeTakeFirst();
  if (mark !== undefined && dayOf(usedMs) < dayOf(mark.used_ms)) {
    await reckonDay(writer, pointId, usedMs, dayOf);
    return dayOf(usedMs);
  }
  if (mark !== undefined && dayOf(usedMs) === dayOf(mark.used_ms)) return null;
  await writer
    .insertInto('day_marks')
    .values({ point_id: pointId, used_ms: usedMs })
    .onConflict((conflict) => conflict.column('point_id').doUpdateSet({ used_ms: usedMs }))
    .execute();
  if (mark === undefined) return null;
  await reckonDay(writer, pointId, mark.used_ms, dayOf);
  return dayOf(mark.used_ms);
}

interface DayRow {
  readonly used_ms: number;
  readonly band_id: number;
  readonly series_id: number;
  readonly condition_id: number;
  readonly level: number;
  readonly running_hours: number | null;
}

async function reckonDay(writer: Writer, pointId: number, withinMs: number, dayOf: DayOf): Promise<void> {
  const day = dayOf(withinMs);
  const rows = await writer
    .selectFrom('levels')
    .innerJoin('measurements', 'measurements.id', 'levels.measurement_id')
    .select([
      'levels.used_ms',
      'levels.band_id',
      'levels.series_id',
      'levels.condition_id',
      'levels.level',
      'measurements.running_hours',
    ])
    .where('levels.point_id', '=', pointId)
    .where('levels.used_ms', '>', withinMs - reachMs)
    .where('levels.used_ms', '<', withinMs + reachMs)
    .where('levels.in_trend', '=', 1)
    .orderBy('levels.used_ms')
    .execute();
  const groups = new Map<string, DayRow[]>();
  for (const row of rows) {
    if (dayOf(row.used_ms) !== day) continue;
    const name = `${row.band_id} ${row.series_id} ${row.condition_id}`;
    const group = groups.get(name);
    if (group === undefined) groups.set(name, [row]);
    else group.push(row);
  }
  const daily = [...groups.values()].map((group) => dailyRow(pointId, day, group));
  await insertRows(writer, 'daily_levels', columns, daily, conflict);
}

function dailyRow(pointId: number, day: number, rows: readonly DayRow[]): DailyLevelsTable {
  const sorted = Float64Array.from(rows, ({ level }) => level).sort();
  const half = (sorted.length - 1) / 2;
  const middle = rows[Math.floor(rows.length / 2)];
  return {
    point_id: pointId,
    band_id: middle.band_id,
    series_id: middle.series_id,
    condition_id: middle.condition_id,
    day,
    used_ms: middle.used_ms,
    running_hours: middle.running_hours,
    count: rows.length,
    least: sorted[0],
    median: (sorted[Math.floor(half)] + sorted[Math.ceil(half)]) / 2,
    greatest: sorted[sorted.length - 1],
  };
}

const columns = [
  'point_id',
  'band_id',
  'series_id',
  'condition_id',
  'day',
  'used_ms',
  'running_hours',
  'count',
  'least',
  'median',
  'greatest',
] as const satisfies readonly (keyof DailyLevelsTable)[];

const conflict = `
  on conflict (point_id, band_id, series_id, condition_id, day) do update set
    used_ms = excluded.used_ms, running_hours = excluded.running_hours, count = excluded.count,
    least = excluded.least, median = excluded.median, greatest = excluded.greatest`;

/** SI r.m.s. */
export interface DailyLevel {
  readonly bandId: number;
  readonly seriesId: number;
  readonly conditionId: number;
  readonly day: number;
  readonly usedMs: number;
  readonly runningHours: number | null;
  readonly count: number;
  readonly least: number;
  readonly median: number;
  readonly greatest: number;
}

/** Daily levels of one band, oldest first, with their used times in [fromMs, toMs). */
export async function dailyLevels(
  reader: Reader,
  range: {
    readonly pointId: number;
    readonly bandId: number;
    readonly seriesId?: number;
    readonly conditionId?: number;
    readonly fromMs: number;
    readonly toMs: number;
  },
): Promise<DailyLevel[]> {
  let query = reader
    .selectFrom('daily_levels')
    .selectAll()
    .where('point_id', '=', range.pointId)
    .where('band_id', '=', range.bandId)
    .where('used_ms', '>=', range.fromMs)
    .where('used_ms', '<', range.toMs);
  if (range.seriesId !== undefined) query = query.where('series_id', '=', range.seriesId);
  if (range.conditionId !== undefined) query = query.where('condition_id', '=', range.conditionId);
  const rows = await query.orderBy('day').orderBy('series_id').orderBy('condition_id').execute();
  return rows.map((row) => ({
    bandId: row.band_id,
    seriesId: row.series_id,
    conditionId: row.condition_id,
    day: row.day,
    usedMs: row.used_ms,
    runningHours: row.running_hours,
    count: row.count,
    least: row.least,
    median: row.median,
    greatest: row.greatest,
  }));
}

/** The middle of a day of one band, series and operating condition. SI r.m.s. */
export type DayMedian = Pick<
  DailyLevel,
  'bandId' | 'seriesId' | 'conditionId' | 'day' | 'usedMs' | 'runningHours' | 'median'
>;

/**
 * Days of some series of a point in [fromDay, toDay), in all operating conditions, oldest first. One query: every series
 * and condition is found by its key, so that the years before cost nothing.
 */
export async function mediansOfPoint(
  reader: Reader,
  range: {
    readonly pointId: number;
    readonly series: readonly { readonly bandId: number; readonly seriesId: number }[];
    readonly fromDay: number;
    readonly toDay: number;
  },
): Promise<DayMedian[]> {
  const { pointId, series, fromDay, toDay } = range;
  if (series.length === 0) return [];
  const bandIds = [...new Set(series.map(({ bandId }) => bandId))];
  const seriesIds = [...new Set(series.map(({ seriesId }) => seriesId))];
  const conditionIds = sql<number>`(select 0 union all select conditions.id from conditions
    join points on points.machine_id = conditions.machine_id where points.id = ${pointId})`;
  return reader
    .selectFrom('daily_levels')
    .select([
      'band_id as bandId',
      'series_id as seriesId',
      'condition_id as conditionId',
      'day',
      'used_ms as usedMs',
      'running_hours as runningHours',
      'median',
    ])
    .where('point_id', '=', pointId)
    .where('band_id', 'in', bandIds)
    .where('series_id', 'in', seriesIds)
    .where('condition_id', 'in', conditionIds)
    .where('day', '>=', fromDay)
    .where('day', '<', toDay)
    .orderBy('day')
    .execute();
}
