import type { LimitFacts } from '../advisory/facts.ts';
import type { LimitAhead, TrendFacts } from '../advisory/trend-words.ts';
import { localDay } from '../config/local-time.ts';
import type { Point } from '../config/site.ts';
import { type DayLevel, type TrendLine, timeToLimit, trendOf, trendRules } from '../prognosis/trend.ts';
import { conditionNames } from '../store/conditions.ts';
import { type DayMedian, mediansOfPoint } from '../store/daily-levels.ts';
import type { Reader } from '../store/lent-connection.ts';
import { lastBreak } from '../store/notes.ts';
import type { StoredMeasurement } from '../store/read-measurements.ts';
import type { TrendPoint } from '../store/read-trends.ts';
import { limitFactsNow, limitsInForce } from './limits-in-force.ts';
import type { SiteView } from './site-view.ts';

/**
 * Trends from the daily levels in the ledger: one series and operating condition, since the last repair or change of sensor, over the
 * hours that the machine ran.
 */

/** Days of the calendar in which running days are looked for: a machine that runs every other day has its thirty. */
export const lookBackDays = 60;
const hourMs = 3_600_000;

/** What there is to go by for the bands of a point. */
export interface PointDays {
  /** The day of the newest recording and later ones are not among them: they have not ended. */
  readonly days: readonly DayMedian[];
  readonly broken: TrendFacts['broken'];
}

/** A recording and its levels, whose series the days are of. */
export interface Newest {
  readonly usedMs: number;
  readonly runningHours: number | null;
  readonly levels: readonly Pick<TrendPoint, 'bandId' | 'seriesId' | 'conditionId' | 'level'>[];
}

/**
 * One query for all bands. What was before a repair takes no part, nor does the day of the repair itself, which may be
 * of both.
 *
 * @param knownUntilMs used time up to which repairs are known; a later one than the recording withdraws its trend
 */
export async function daysOfPoint(
  reader: Reader,
  about: {
    readonly pointId: number;
    readonly newest: Newest;
    readonly knownUntilMs: number;
    readonly timeZone: string;
  },
): Promise<PointDays> {
  const { pointId, newest, knownUntilMs, timeZone } = about;
  const toDay = localDay(newest.usedMs, timeZone);
  const note = await lastBreak(reader, { pointId, toMs: knownUntilMs });
  const brokenDay = note === null ? Number.NEGATIVE_INFINITY : localDay(note.atMs, timeZone);
  const fromDay = toDay - lookBackDays;
  const broken: TrendFacts['broken'] =
    note === null || brokenDay < fromDay
      ? null
      : { kind: note.kind === 'repair' ? 'repair' : 'sensor-changed', atMs: note.atMs };
  const range = { pointId, series: newest.levels, fromDay: Math.max(fromDay, brokenDay + 1), toDay };
  return { days: await mediansOfPoint(reader, range), broken };
}

/** The trend of each band of a recording by its ledger id, with the next of its limits. */
export function trendsOfBands(
  { days, broken }: PointDays,
  newest: Newest,
  known: {
    readonly limitsOf: (bandId: number) => readonly LimitFacts[];
    /** Operating conditions of the ledger by its id. */
    readonly conditions: ReadonlyMap<number, string>;
  },
): Map<number, TrendFacts> {
  const bySeries = new Map<string, DayMedian[]>();
  for (const day of days) {
    const key = `${day.bandId} ${day.seriesId}`;
    const group = bySeries.get(key);
    if (group === undefined) bySeries.set(key, [day]);
    else group.push(day);
  }
  return new Map(
    newest.levels.map((level) => {
      const own = bySeries.get(`${level.bandId} ${level.seriesId}`) ?? [];
      const conditionId = comparedCondition(own, level.conditionId);
      const { line, time, nowHours } = timed(
        own.filter((day) => day.conditionId === conditionId),
        newest,
      );
      const trend = trendOf(line);
      const isOwn = conditionId === level.conditionId;
      const ahead =
        isOwn && (trend.kind === 'rising' || trend.kind === 'falling')
          ? limitAhead(trend, { level: level.level, nowHours }, known.limitsOf(level.bandId))
          : null;
      return [
        level.bandId,
        { trend, time, condition: known.conditions.get(conditionId) ?? '', broken, ahead },
      ];
    }),
  );
}

/** That of the recording; where too few days are known of it, the one of which most are. */
function comparedCondition(days: readonly DayMedian[], own: number): number {
  const counts = new Map<number, number>([[own, 0]]);
  for (const { conditionId } of days) counts.set(conditionId, (counts.get(conditionId) ?? 0) + 1);
  if ((counts.get(own) ?? 0) >= trendRules.leastDays) return own;
  const [most] = [...counts].sort(([, a], [, b]) => b - a);
  return most !== undefined && most[1] > (counts.get(own) ?? 0) ? most[0] : own;
}

/** Running hours as time; where they are not known throughout, the calendar. */
function timed(
  all: readonly DayMedian[],
  newest: Newest,
): { readonly line: DayLevel[]; readonly time: TrendFacts['time']; readonly nowHours: number } {
  const days = all.slice(-trendRules.windowDays);
  const hours = days.map(({ runningHours }) => runningHours);
  const now = newest.runningHours;
  const known = now !== null && hours.every((one, n) => one !== null && one >= (hours[n - 1] ?? 0));
  const line = days.map(({ usedMs, runningHours, median }) => ({
    dayMs: usedMs,
    runningHours: known && runningHours !== null ? runningHours : usedMs / hourMs,
    level: median,
  }));
  return {
    line: line.filter(({ level }) => level > 0),
    time: known ? 'running' : 'calendar',
    nowHours: known ? now : newest.usedMs / hourMs,
  };
}

/** The nearest limit that neither the level nor the line has passed, and when the line would reach it. */
function limitAhead(
  trend: TrendLine,
  now: { readonly level: number; readonly nowHours: number },
  limits: readonly LimitFacts[],
): LimitAhead | null {
  const { line } = trend;
  // The days end with the last whole one; the machine has run on since.
  const runningHoursNow = Math.max(now.nowHours, trend.runningHoursNow);
  const lineNow = Math.exp(line.y + line.slope * (runningHoursNow - line.x));
  const side = trend.kind === 'rising' ? 'upper' : 'lower';
  const before = limits
    // A rate is not a level that a line could reach.
    .filter((limit) => limit.side === side && limit.compared === undefined)
    .flatMap(({ id, alert, danger }) => [
      ...(alert === null ? [] : [{ limit: id, severity: 'alert' as const, at: alert }]),
      ...(danger === null ? [] : [{ limit: id, severity: 'danger' as const, at: danger }]),
    ])
    .filter(({ at }) =>
      side === 'upper' ? at > Math.max(now.level, lineNow) : at < Math.min(now.level, lineNow) && at > 0,
    )
    .sort((a, b) => (side === 'upper' ? a.at - b.at : b.at - a.at));
  const [next] = before;
  if (next === undefined) return null;
  const time = timeToLimit({ ...trend, runningHoursNow }, next.at);
  return time === null ? null : { ...next, time };
}

/** The trend behind a level of a recording, with the limits of its band as they stand for it. Null: the level is not stored. */
export async function trendOfLevel(
  reader: Reader,
  view: SiteView,
  of: {
    readonly point: Point;
    readonly measurement: StoredMeasurement;
    readonly level: TrendPoint | undefined;
    readonly knownUntilMs: number;
  },
): Promise<TrendFacts | null> {
  const { point, measurement, level, knownUntilMs } = of;
  if (level === undefined) return null;
  const newest = {
    usedMs: measurement.usedMs,
    runningHours: measurement.runningHours,
    levels: [level],
  };
  const days = await daysOfPoint(reader, {
    pointId: measurement.pointId,
    newest,
    knownUntilMs,
    timeZone: view.site.timeZone,
  });
  const inForce = await limitsInForce(reader, view, point, measurement);
  const limits = inForce.filter(
    ({ limit }) => view.ids.bandId(point.machineId, point.id, limit.bandId) === level.bandId,
  );
  const trends = trendsOfBands(days, newest, {
    limitsOf: () => limits.map(limitFactsNow),
    conditions: await conditionNames(reader),
  });
  return trends.get(level.bandId) ?? null;
}
