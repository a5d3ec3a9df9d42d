import { type Band, type Point, pointPath } from '../config/site.ts';
import type { Reader } from '../store/lent-connection.ts';
import { readLevels, type Series, seriesOfPoint, type TrendPoint } from '../store/read-trends.ts';
import { type TrendMarks, trendMarks } from '../store/trend-marks.ts';

/** One level of a band's trend, with what stands beside it. */
export interface TrendRow extends TrendPoint, TrendMarks {
  /** First of another series than the row before: what moves the number was changed. */
  readonly seriesBreak: boolean;
}

export interface BandTrend {
  readonly rows: readonly TrendRow[];
  /** Series that have a row. */
  readonly series: readonly Series[];
  /** There are older rows than `limit` allowed. */
  readonly cut: boolean;
}

/** The levels of a band in [fromMs, toMs), also those outside the trend (stopped, transient); the newest `limit`. */
export async function trendOfBand(
  reader: Reader,
  point: Point,
  band: Band,
  range: { readonly fromMs: number; readonly toMs: number; readonly limit: number },
): Promise<BandTrend | { readonly unknown: string }> {
  const ids = await idsOf(reader, point, band);
  if (ids === null) {
    return {
      unknown: `the ledger does not know ${pointPath(point)} ${band.id} yet; the service takes over the site file when it starts or is told to re-read it`,
    };
  }
  const found = await readLevels(reader, { ...ids, ...range, limit: range.limit + 1, outOfTrendToo: true });
  const levels = found.slice(-range.limit);
  const marks = await trendMarks(
    reader,
    levels.map(({ measurementId }) => measurementId),
  );
  const rows = levels.map((level, n): TrendRow => {
    const before = levels[n - 1];
    const beside = marks.get(level.measurementId);
    if (beside === undefined) throw new Error(`level without measurement ${level.measurementId}`);
    return { ...level, ...beside, seriesBreak: before !== undefined && before.seriesId !== level.seriesId };
  });
  const used = new Set(rows.map(({ seriesId }) => seriesId));
  const series = (await seriesOfPoint(reader, ids.pointId)).filter(({ id }) => used.has(id));
  return { rows, series, cut: found.length > range.limit };
}

/** Null where the ledger has not taken over a site file with that band. */
async function idsOf(
  reader: Reader,
  { machineId, id }: Point,
  band: Band,
): Promise<{ readonly pointId: number; readonly bandId: number } | null> {
  const row = await reader
    .selectFrom('bands')
    .innerJoin('points', 'points.id', 'bands.point_id')
    .innerJoin('machines', 'machines.id', 'points.machine_id')
    .select(['points.id as pointId', 'bands.id as bandId'])
    .where('machines.id_in_site', '=', machineId)
    .where('points.id_in_site', '=', id)
    .where('bands.id_in_site', '=', band.id)
    .where('machines.retired_ms', 'is', null)
    .where('points.retired_ms', 'is', null)
    .where('bands.retired_ms', 'is', null)
    .executeTakeFirst();
  return row ?? null;
}
