import type { TrendChartFacts, TrendChartLevel } from '../advisory/charts/trend-chart.ts';
import type { AlarmFacts } from '../advisory/facts.ts';
import { nameOf } from '../advisory/wording.ts';
import type { Reader } from '../store/lent-connection.ts';
import { notesOf } from '../store/notes.ts';
import { readLevels } from '../store/read-trends.ts';
import { trendMarks } from '../store/trend-marks.ts';
import type { SiteView } from './site-view.ts';

/** The picture of an alarm's band: the last thirty days, and where they lead if they go on so. */

const dayMs = 86_400_000;
const daysBefore = 30;
const daysAhead = 10;
/** A recording every ten minutes for thirty days; of more, the newest. */
const mostLevels = 4500;

/** Null where there are too few levels for a picture. */
export async function alarmChart(
  reader: Reader,
  view: SiteView,
  alarm: AlarmFacts,
): Promise<TrendChartFacts | null> {
  const point = view.point(`${alarm.machine.id}/${alarm.point.id}`);
  if (point?.bands.some(({ id }) => id === alarm.band.id) !== true) return null;
  const pointId = view.ids.pointId(point.machineId, point.id);
  const bandId = view.ids.bandId(point.machineId, point.id, alarm.band.id);
  const toMs = alarm.level.usedMs;
  const range = { pointId, bandId, fromMs: toMs - daysBefore * dayMs, toMs: toMs + 1, limit: mostLevels };
  const all = await readLevels(reader, range);
  const seriesId = all.at(-1)?.seriesId;
  const own = all.filter((level) => level.seriesId === seriesId);
  if (own.length < 3) return null;
  const marks = await trendMarks(
    reader,
    own.map(({ measurementId }) => measurementId),
  );
  const levels = own.map((level): TrendChartLevel => {
    const flags = marks.get(level.measurementId)?.flags ?? [];
    return {
      usedMs: level.usedMs,
      level: level.level,
      low: level.intervalLow,
      high: level.intervalHigh,
      kind: flags.includes('late') ? 'late' : flags.length > 0 ? 'flagged' : 'plain',
    };
  });
  const machineId = view.ids.machineId(point.machineId);
  const notes = await notesOf(reader, { machineId, pointId, fromMs: own[0].usedMs, toMs: toMs + 1 });
  const raised = { atMs: alarm.sinceMs, text: `${alarm.severity} ${alarm.number}`, breaks: false };
  const projection = projectionOf(alarm);
  return {
    title: `${nameOf(alarm.machine)}, ${nameOf(alarm.point)}: ${alarm.band.id}`,
    timeZone: view.site.timeZone,
    display: alarm.band.display,
    fromMs: own[0].usedMs,
    toMs: Math.max(toMs, projection?.points.at(-1)?.atMs ?? 0),
    levels,
    alert: alarm.limit.alert,
    danger: alarm.limit.danger,
    baseline: alarm.before.baseline,
    marks: [
      ...notes.map(({ atMs, kind }) => ({
        atMs,
        text: kind,
        breaks: kind === 'repair' || kind === 'sensor-changed',
      })),
      ...(alarm.number > 0 && raised.atMs >= own[0].usedMs ? [raised] : []),
    ],
    projection,
  };
}

/** A quarter of the picture ahead, where the words speak of a limit ahead; as though the machine ran on without a stop. */
function projectionOf({ trend, level }: AlarmFacts): TrendChartFacts['projection'] {
  const line = trend?.trend;
  if (trend?.ahead == null || line === undefined || (line.kind !== 'rising' && line.kind !== 'falling'))
    return null;
  const points = Array.from({ length: daysAhead + 1 }, (_, days) => ({
    atMs: level.usedMs + days * dayMs,
    level: line.levelNow * line.growthPerDay ** days,
    low: line.levelNow * line.growthPerDayLow ** days,
    high: line.levelNow * line.growthPerDayHigh ** days,
  }));
  return { points };
}
