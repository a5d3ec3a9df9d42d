import { changeOf, mediansOf } from '../advisory/ranking.ts';
import type { BandNow, Judging, PointNow } from '../advisory/summary-facts.ts';
import type { TrendFacts } from '../advisory/trend-words.ts';
import type { MachineDay } from '../assessment/sisters.ts';
import { levelEveryMs } from '../config/meaning.ts';
import { type Machine, type Point, pointPath } from '../config/site.ts';
import type { TroubleKind } from '../detection/alarm.ts';
import type { MachineMemory } from '../detection/machine-state.ts';
import type { StoredAlarm } from '../store/alarms.ts';
import type { DayMedian } from '../store/daily-levels.ts';
import type { Reader } from '../store/lent-connection.ts';
import { lastBreak } from '../store/notes.ts';
import { type BareLevel, bareLevels, newestInTrend } from '../store/past-levels.ts';
import { measurementById, newestMeasurement } from '../store/read-measurements.ts';
import { seriesOfPoint } from '../store/read-trends.ts';
import type { PointArrivals } from '../store/sources.ts';
import { baselinesNow } from './baselines-now.ts';
import { bandFacts, machineFacts, pointFacts } from './fact-names.ts';
import { levelFacts } from './level-facts.ts';
import { limitFactsNow, limitsInForce } from './limits-in-force.ts';
import type { PointBehind } from './sister-facts.ts';
import type { SiteView } from './site-view.ts';
import { daysOfPoint, type Newest, trendsOfBands } from './trend-facts.ts';
import { zoneFacts, zoneReading } from './zone-facts.ts';

/** One point as the summary sees it: can it be judged, and what do its bands say. */
export interface PointKnown {
  readonly view: SiteView;
  readonly machine: Machine;
  readonly point: Point;
  /** Alarm records of the point, limits and troubles. */
  readonly alarms: readonly StoredAlarm[];
  readonly arrivals: PointArrivals | undefined;
  readonly memory: MachineMemory | null;
  /** It, or its machine. */
  readonly outOfService: boolean;
  readonly nowMs: number;
  readonly hasSisters: boolean;
  /** Operating conditions of the ledger by its id. */
  readonly conditions: ReadonlyMap<number, string>;
}

/** A point, and for its sisters the days behind its levels. */
export interface PointGathered {
  readonly now: PointNow;
  readonly behind: PointBehind | null;
}

const dayMs = 86_400_000;
/** A machine that has not run for longer shows no level. */
const oldestLevelMs = 60 * dayMs;
/** Levels a band from which a change is reckoned, at most: hourly ones over eight days are 192. */
const mostLevels = 400;

export async function pointNow(reader: Reader, known: PointKnown): Promise<PointGathered> {
  const { view, machine, point, arrivals, hasSisters } = known;
  const { bands, newest, days } = await bandsNow(reader, known);
  return {
    now: {
      machine: machineFacts(view, machine.id),
      point: pointFacts(view, machine.id, point.id),
      judging: await judgingOf(reader, known),
      lastMs: arrivals?.newestUsedMs ?? null,
      bands,
    },
    behind: hasSisters && newest !== null ? behindOf(known, newest, days) : null,
  };
}

/** Troubles of a point while which nothing usable comes from it. A wrong rate is analysed at the file's own rate. */
const blinding: readonly TroubleKind[] = [
  'overdue',
  'dead-sensor',
  'reads-stopped',
  'unreadable',
  'uneven-time',
  'repeats-itself',
];

async function judgingOf(reader: Reader, known: PointKnown): Promise<Judging> {
  const { view, point, alarms, arrivals, nowMs } = known;
  if (known.outOfService) return 'out-of-service';
  const isBlind = alarms.some(
    ({ subject, state }) =>
      subject.kind === 'trouble' && state.condition === 'trouble' && blinding.includes(subject.trouble),
  );
  const { overdueAfterMs, settleMs } = point.recordings;
  const evaluatedMs = arrivals?.newestEvaluatedUsedMs ?? null;
  if (isBlind || evaluatedMs === null || nowMs - evaluatedMs > overdueAfterMs + settleMs) return 'blind';
  const pointId = view.ids.pointId(point.machineId, point.id);
  const newest = await newestMeasurement(reader, pointId, { evaluated: true, waiting: true });
  if (newest?.machineState === 'stopped') return 'stopped';
  if (point.limits.length === 0) return 'no-limit';
  const judged = await newestMeasurement(reader, pointId, { evaluated: true });
  const limits = await limitsInForce(reader, view, point, judged);
  return limits.every(({ now }) => 'unknown' in now) ? 'not-judged' : 'judged';
}

interface BandsNow {
  readonly bands: readonly BandNow[];
  readonly newest: Newest | null;
  readonly days: readonly DayMedian[];
}

async function bandsNow(
  reader: Reader,
  { view, machine, point, nowMs, conditions }: PointKnown,
): Promise<BandsNow> {
  const pointId = view.ids.pointId(machine.id, point.id);
  const measurementId = await newestInTrend(reader, pointId, nowMs - oldestLevelMs);
  const measurement = measurementId === null ? null : await measurementById(reader, measurementId);
  const series = new Map((await seriesOfPoint(reader, pointId)).map((one) => [one.id, one]));
  const brokenMs = (await lastBreak(reader, { pointId, toMs: nowMs }))?.atMs ?? Number.NEGATIVE_INFINITY;
  const range = { pointId, fromMs: Math.max(nowMs - 8 * dayMs, brokenMs), toMs: nowMs + 1 };
  const past = await bareLevels(reader, { ...range, everyMs: levelEveryMs(point), mostTimes: mostLevels });
  const compared = gather(past, comparable);
  const inForce = await limitsInForce(reader, view, point, measurement);
  const baselines = await baselinesNow(reader, view, point);
  const reading = measurement === null ? null : zoneReading(view, machine, point, measurement, series);
  const limitsOf = (bandId: number) =>
    inForce
      .filter(({ limit }) => view.ids.bandId(machine.id, point.id, limit.bandId) === bandId)
      .map(limitFactsNow);
  const { timeZone } = view.site;
  const behind =
    measurement === null
      ? null
      : await daysOfPoint(reader, { pointId, newest: measurement, knownUntilMs: nowMs, timeZone });
  const trends =
    measurement === null || behind === null
      ? new Map<number, TrendFacts>()
      : trendsOfBands(behind, measurement, { limitsOf, conditions });
  const bands = point.bands.map((band): BandNow => {
    const bandId = view.ids.bandId(machine.id, point.id, band.id);
    const level = measurement?.levels.find((one) => one.bandId === bandId);
    const limits = inForce.filter(({ limit }) => limit.bandId === band.id);
    const onlyLower = limits.length > 0 && limits.every(({ limit }) => limit.side === 'lower');
    const levels = level === undefined ? [] : (compared.get(comparable(level)) ?? []);
    const medians = mediansOf(levels, nowMs);
    const onTheWeek =
      medians === null ? null : { level: medians.day, reference: medians.week, since: 'week' as const };
    return {
      band: bandFacts(band.id, band, level === undefined ? undefined : series.get(level.seriesId), machine),
      level: level === undefined || measurement === null ? null : levelFacts(measurement, level),
      limits: limits.map(limitFactsNow),
      change: changeOf(levels, nowMs, onlyLower ? 'lower' : 'upper'),
      zone: reading === null ? null : zoneFacts(machine, reading, band.id, onTheWeek),
      baselines: baselines.get(band.id) ?? [],
      trend: trends.get(bandId) ?? null,
      sister: null,
    };
  });
  return { bands, newest: measurement, days: behind?.days ?? [] };
}

/** The days behind the levels, as a sister machine is held against them. */
function behindOf(
  { view, machine, point, conditions }: PointKnown,
  newest: Newest,
  days: readonly DayMedian[],
): PointBehind {
  const bandIds = new Map(point.bands.map(({ id }) => [view.ids.bandId(machine.id, point.id, id), id]));
  const groups = new Map<string, { bandId: string; condition: string; days: MachineDay[] }>();
  for (const { bandId: ledgerId, seriesId, conditionId, day, median } of days) {
    const bandId = bandIds.get(ledgerId);
    // A level that was turned aside by another series of the same band is no day of this one.
    const isOwn = newest.levels.some((one) => one.bandId === ledgerId && one.seriesId === seriesId);
    if (bandId === undefined || !isOwn) continue;
    const condition = conditions.get(conditionId) ?? '';
    const group = groups.get(`${bandId} ${condition}`) ?? { bandId, condition, days: [] };
    groups.set(`${bandId} ${condition}`, group);
    group.days.push({ day, level: median });
  }
  const conditionNow = new Map(
    newest.levels.flatMap(({ bandId, conditionId }) => {
      const id = bandIds.get(bandId);
      return id === undefined ? [] : [[id, conditions.get(conditionId) ?? ''] as const];
    }),
  );
  return { machine, point, conditionNow, bands: [...groups.values()] };
}

/** Levels are compared within one series and one operating condition. */
function comparable({ seriesId, conditionId }: Pick<BareLevel, 'seriesId' | 'conditionId'>): string {
  return `${seriesId} ${conditionId}`;
}

function gather(levels: readonly BareLevel[], keyOf: (level: BareLevel) => string): Map<string, BareLevel[]> {
  const groups = new Map<string, BareLevel[]>();
  for (const level of levels) {
    const group = groups.get(keyOf(level));
    if (group === undefined) groups.set(keyOf(level), [level]);
    else group.push(level);
  }
  return groups;
}

/** Alarm records by the point they are about. */
export function alarmsByPoint(alarms: readonly StoredAlarm[]): Map<string, StoredAlarm[]> {
  const byPoint = new Map<string, StoredAlarm[]>();
  for (const alarm of alarms) {
    const { machineId, pointId } = alarm.subject;
    if (machineId === null || pointId === null) continue;
    const path = pointPath({ machineId, id: pointId });
    byPoint.set(path, [...(byPoint.get(path) ?? []), alarm]);
  }
  return byPoint;
}
