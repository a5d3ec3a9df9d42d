import type { TrendFacts } from '../advisory/trend-words.ts';
import { type Band, type Machine, type Point, pointPath } from '../config/site.ts';
import { conditionNames } from '../store/conditions.ts';
import type { Reader } from '../store/lent-connection.ts';
import { notesOf, type StoredNote } from '../store/notes.ts';
import { measurementById, type StoredMeasurement } from '../store/read-measurements.ts';
import { readLevels, type Series, seriesOfPoint, type TrendPoint } from '../store/read-trends.ts';
import { type TrendMarks, trendMarks } from '../store/trend-marks.ts';
import { type LimitInForce, limitFactsNow, limitsOfStored } from './limits-in-force.ts';
import { limitsOverTime } from './limits-over-time.ts';
import { daysOfPoint, trendsOfBands } from './trend-facts.ts';

/** One level of a band's trend, with what stands beside it. */
export interface TrendRow extends TrendPoint, TrendMarks {
  /** First of another series than the row before: what moves the number was changed. */
  readonly seriesBreak: boolean;
}

export interface BandTrend {
  readonly rows: readonly TrendRow[];
  /** Series that have a row. */
  readonly series: readonly Series[];
  /** Notes of the point and of its machine within these rows, oldest first. */
  readonly notes: readonly StoredNote[];
  /** The band's limits as they stand for the newest row of the trend. */
  readonly limits: readonly LimitInForce[];
  /** What the days up to the newest row say; null: no row is in the trend. */
  readonly trend: TrendFacts | null;
  /** The same for any row, but for rates, which judge the line through many. */
  readonly limitsAt: (row: TrendRow) => readonly LimitInForce[];
  /** There are older rows than `limit` allowed. */
  readonly cut: boolean;
}

/** The levels of a band in [fromMs, toMs), also those outside the trend (stopped, transient); the newest `limit`. */
export async function trendOfBand(
  reader: Reader,
  machine: Machine,
  point: Point,
  band: Band,
  range: {
    readonly fromMs: number;
    readonly toMs: number;
    readonly limit: number;
    readonly timeZone: string;
  },
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
  const fromMs = found.length > range.limit ? (rows[0]?.usedMs ?? range.fromMs) : range.fromMs;
  const notes = await notesOf(reader, {
    machineId: ids.machineId,
    pointId: ids.pointId,
    fromMs,
    toMs: range.toMs,
  });
  const limitsAt = await limitsOverTime(reader, { machine, point, band, seriesIds: [...used] });
  const newest = rows.findLast(({ inTrend }) => inTrend);
  const measurement = newest === undefined ? null : await measurementById(reader, newest.measurementId);
  const all = await limitsOfStored(reader, {
    machine,
    point,
    measurement,
    bandIds: new Map([[ids.bandId, band.id]]),
    machineLedgerId: ids.machineId,
  });
  const limits = all.filter(({ limit }) => limit.bandId === band.id);
  return {
    rows,
    series,
    notes,
    limits,
    trend: await trendBehind(reader, measurement, newest, {
      limits,
      toMs: range.toMs,
      timeZone: range.timeZone,
    }),
    limitsAt,
    cut: found.length > range.limit,
  };
}

/** Null where the ledger has not taken over a site file with that band. */
async function idsOf(
  reader: Reader,
  { machineId, id }: Point,
  band: Band,
): Promise<{ readonly machineId: number; readonly pointId: number; readonly bandId: number } | null> {
  const row = await reader
    .selectFrom('bands')
    .innerJoin('points', 'points.id', 'bands.point_id')
    .innerJoin('machines', 'machines.id', 'points.machine_id')
    .select(['machines.id as machineId', 'points.id as pointId', 'bands.id as bandId'])
    .where('machines.id_in_site', '=', machineId)
    .where('points.id_in_site', '=', id)
    .where('bands.id_in_site', '=', band.id)
    .where('machines.retired_ms', 'is', null)
    .where('points.retired_ms', 'is', null)
    .where('bands.retired_ms', 'is', null)
    .executeTakeFirst();
  return row ?? null;
}

async function trendBehind(
  reader: Reader,
  measurement: StoredMeasurement | null,
  row: TrendRow | undefined,
  about: {
    readonly limits: readonly LimitInForce[];
    readonly toMs: number;
    readonly timeZone: string;
  },
): Promise<TrendFacts | null> {
  if (measurement === null || row === undefined) return null;
  const { usedMs, runningHours, pointId } = measurement;
  const newest = { usedMs, runningHours, levels: [row] };
  const { timeZone } = about;
  const days = await daysOfPoint(reader, { pointId, newest, knownUntilMs: about.toMs, timeZone });
  const trends = trendsOfBands(days, newest, {
    limitsOf: () => about.limits.map(limitFactsNow),
    conditions: await conditionNames(reader),
  });
  return trends.get(row.bandId) ?? null;
}
