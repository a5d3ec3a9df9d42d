import type {
  AlarmFacts,
  LevelFacts,
  LinesFacts,
  OtherPointFacts,
  RecordingFacts,
} from '../advisory/facts.ts';
import { compareLines } from '../advisory/line-changes.ts';
import { largestShare } from '../advisory/ranking.ts';
import type { Machine, Point } from '../config/site.ts';
import { usualDisplayUnit } from '../config/units.ts';
import { isUsable } from '../detection/baseline.ts';
import { baselinesOf } from '../store/baselines.ts';
import type { Reader } from '../store/lent-connection.ts';
import { lastBreak, type NoteKind } from '../store/notes.ts';
import { peaksBetween } from '../store/past-levels.ts';
import { newestMeasurement, type StoredMeasurement } from '../store/read-measurements.ts';
import { peaksOf, readLevels, seriesOfPoint, type TrendPoint } from '../store/read-trends.ts';
import { recordingById } from '../store/recordings.ts';
import { bandFacts, pointFacts } from './fact-names.ts';
import { limitFactsNow, limitsInForce } from './limits-in-force.ts';
import type { SiteView } from './site-view.ts';

/** Numbers around an alarm: the levels before, the lines that rose, the machine's other points, the recording. */

const hourMs = 3_600_000;
const dayMs = 24 * hourMs;

export function levelFacts(
  measurement: Pick<StoredMeasurement, 'confidencePercent'>,
  level: TrendPoint,
): LevelFacts {
  const { usedMs, intervalLow, intervalHigh, atLeast } = level;
  const confidencePercent = measurement.confidencePercent ?? 95;
  return { usedMs, level: level.level, intervalLow, intervalHigh, confidencePercent, atLeast };
}

export interface SeriesPlace {
  readonly pointId: number;
  readonly bandId: number;
  readonly seriesId: number;
  readonly conditionId: number;
  /** Of the recording whose past is asked for. */
  readonly usedMs: number;
  /** How often a recording is expected: 'a day ago' is the newest one that is half of this short of a day old, or older. */
  readonly everyMs: number;
}

/** How far back the levels before reach. */
const pastMs = 60 * dayMs;

/**
 * The last four of the same series and operating condition, the one of a day before and of a week before, each with half a
 * day's grace, and what is usual. None from before a repair or a change of sensor: that was another machine.
 */
export async function levelsBefore(reader: Reader, place: SeriesPlace): Promise<AlarmFacts['before']> {
  const { pointId, bandId, seriesId, conditionId, usedMs } = place;
  const last = await lastBreak(reader, { pointId, toMs: usedMs });
  const broken = last !== null && last.atMs > usedMs - pastMs ? last : null;
  const newest = async (fromMs: number, toMs: number, limit: number) => {
    const levels = await readLevels(reader, {
      pointId,
      bandId,
      seriesId,
      conditionId,
      fromMs: Math.max(fromMs, broken?.atMs ?? fromMs),
      toMs,
      limit,
    });
    return levels.map(({ usedMs: at, level }) => ({ usedMs: at, level })).reverse();
  };
  const ago = async (ms: number) => {
    const about = usedMs - ms;
    return (await newest(about - dayMs / 2, about + Math.min(place.everyMs, dayMs) / 2, 1))[0] ?? null;
  };
  return {
    last: await newest(usedMs - pastMs, usedMs, 4),
    dayBefore: await ago(dayMs),
    weekBefore: await ago(7 * dayMs),
    baseline: await usualLevel(reader, place),
    ...(broken === null ? {} : { broken: { kind: breakingKind(broken.kind), atMs: broken.atMs } }),
  };
}

/** Median of the baseline, SI r.m.s.; null where there is none to go by. */
async function usualLevel(reader: Reader, { seriesId, conditionId }: SeriesPlace): Promise<number | null> {
  const baselines = await baselinesOf(reader, [seriesId]);
  const own = baselines.find((one) => one.conditionId === conditionId) ?? null;
  return isUsable(own) ? Math.exp(own.medianLog) : null;
}

function breakingKind(kind: NoteKind): 'repair' | 'sensor-changed' {
  return kind === 'repair' ? 'repair' : 'sensor-changed';
}

/**
 * The lines of a measurement against those of about a week before: the newest spectrum that is a week old, or the
 * oldest day at hand where the watch, or the machine since its repair, has not lasted so long.
 */
export async function linesFacts(
  reader: Reader,
  point: Point | undefined,
  measurement: StoredMeasurement,
): Promise<LinesFacts | null> {
  const { pointId, usedMs, averaging } = measurement;
  if (averaging === null) return null;
  const brokenMs = (await lastBreak(reader, { pointId, toMs: usedMs }))?.atMs ?? Number.NEGATIVE_INFINITY;
  const spans = [7, 3, 1].map((days) => ({
    fromMs: Math.max(usedMs - (days === 7 ? 14 : 7) * dayMs, brokenMs),
    toMs: usedMs - days * dayMs + hourMs,
  }));
  let before: Awaited<ReturnType<typeof peaksBetween>> = null;
  for (const span of spans) before ??= await peaksBetween(reader, pointId, span);
  const now = { peaks: await peaksOf(reader, measurement.id), lineSpacingHz: averaging.lineSpacingHz };
  const then =
    before === null
      ? { peaks: [], lineSpacingHz: now.lineSpacingHz }
      : { peaks: await peaksOf(reader, before.measurementId), lineSpacingHz: before.lineSpacingHz };
  return {
    display: usualDisplayUnit(point?.quantity ?? measurement.quantity, measurement.unit),
    comparedWithMs: before?.usedMs ?? null,
    lines: compareLines(now, then),
  };
}

/** Each other point of the machine with the band that uses most of its alert limit; an old level is none. */
export async function otherPoints(
  reader: Reader,
  view: SiteView,
  machine: Machine | undefined,
  except: { readonly pointId: string; readonly usedMs: number },
): Promise<OtherPointFacts[]> {
  const facts: OtherPointFacts[] = [];
  for (const point of machine?.points ?? []) {
    if (point.id === except.pointId) continue;
    facts.push(await otherPoint(reader, view, machine, point, except.usedMs));
  }
  return facts;
}

async function otherPoint(
  reader: Reader,
  view: SiteView,
  machine: Machine | undefined,
  point: Point,
  usedMs: number,
): Promise<OtherPointFacts> {
  const named = pointFacts(view, point.machineId, point.id);
  const pointId = view.ids.pointId(point.machineId, point.id);
  const measurement = await newestMeasurement(reader, pointId, { evaluated: true });
  const { overdueAfterMs, settleMs } = point.recordings;
  const old = measurement !== null && usedMs - measurement.usedMs > overdueAfterMs + settleMs;
  if (measurement === null || old) return { point: named, band: null, level: null, share: null };
  const series = new Map((await seriesOfPoint(reader, pointId)).map((one) => [one.id, one]));
  const inForce = await limitsInForce(reader, view, point, measurement);
  const bands = point.bands.flatMap((band) => {
    const bandId = view.ids.bandId(point.machineId, point.id, band.id);
    const level = measurement.levels.find((one) => one.bandId === bandId);
    if (level === undefined) return [];
    const limits = inForce.filter(({ limit }) => limit.bandId === band.id).map(limitFactsNow);
    const share = largestShare(level.level, limits);
    return [{ band: bandFacts(band.id, band, series.get(level.seriesId), machine), level, share }];
  });
  const most = bands.sort((a, b) => (b.share ?? -1) - (a.share ?? -1))[0];
  if (most === undefined) return { point: named, band: null, level: null, share: null };
  return { point: named, band: most.band, level: levelFacts(measurement, most.level), share: most.share };
}

export async function recordingFacts(
  reader: Reader,
  measurement: StoredMeasurement,
  came: { readonly late: boolean; readonly fromBacklog: boolean },
): Promise<RecordingFacts> {
  const recording = await recordingById(reader, measurement.recordingId);
  const quality = [...(recording?.quality ?? []), ...measurement.quality];
  const late = came.late || quality.some(({ flag }) => flag === 'late');
  return {
    fileName: recording?.fileName ?? null,
    startMs: measurement.usedMs,
    arrivedMs: recording?.arrivedMs ?? measurement.usedMs,
    arrival: late ? 'late' : came.fromBacklog ? 'backlog' : 'in-time',
    durationS: measurement.durationS,
    speed: measurement.speed,
    loadPercent: measurement.loadPercent,
    averaging: measurement.averaging,
    quality: quality.filter(
      (one, index) =>
        quality.findIndex(({ flag, detail }) => flag === one.flag && detail === one.detail) === index,
    ),
  };
}
