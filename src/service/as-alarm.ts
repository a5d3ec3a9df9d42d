import type { AlarmFacts, AlarmMailFacts } from '../advisory/facts.ts';
import { shareOfAlert } from '../advisory/ranking.ts';
import { levelEveryMs } from '../config/meaning.ts';
import type { Machine, Point } from '../config/site.ts';
import type { Reader } from '../store/lent-connection.ts';
import { newestMeasurement, type StoredMeasurement } from '../store/read-measurements.ts';
import { seriesOfPoint, type TrendPoint } from '../store/read-trends.ts';
import { alarmCharts } from './alarm-charts.ts';
import { evidenceFacts } from './evidence-now.ts';
import { bandFacts, machineFacts, pointFacts, siteFacts } from './fact-names.ts';
import { levelFacts, levelsBefore, linesFacts, otherPoints, recordingFacts } from './level-facts.ts';
import { type LimitInForce, limitFactsNow, limitsInForce } from './limits-in-force.ts';
import type { SiteView } from './site-view.ts';
import { trendOfLevel } from './trend-facts.ts';
import { alarmZone } from './zone-facts.ts';

/**
 * The alarm mail that the newest recording of a point would make, marked TEST: of the limit that is used up most. Nothing
 * is raised. In words why there is none to show.
 */
export async function asAlarm(
  reader: Reader,
  view: SiteView,
  point: Point,
  nowMs: number,
): Promise<AlarmMailFacts | { readonly refused: string }> {
  const machine = view.machine(point.machineId);
  const pointId = view.ids.pointId(machine.id, point.id);
  if (point.limits.length === 0)
    return { refused: `${machine.id}/${point.id} has no limit in the site file, so it can never alarm` };
  const measurement = await newestMeasurement(reader, pointId, { evaluated: true });
  if (measurement === null || measurement.levels.length === 0) {
    return {
      refused: `there is no level of ${machine.id}/${point.id} yet; put a recording into the drop folder`,
    };
  }
  const limits = await limitsInForce(reader, view, point, measurement);
  const chosen = mostUsed(view, point, measurement, limits);
  if (chosen === null) return { refused: `${machine.id}/${point.id}: ${whyNone(limits)}` };
  const alarm = await alarmOf(reader, view, { machine, point, pointId, measurement, ...chosen });
  return {
    site: siteFacts(view),
    machine: machineFacts(view, machine.id),
    writtenMs: nowMs,
    alarms: [{ ...alarm, charts: await alarmCharts(reader, view, alarm, 0) }],
    troubles: [],
    threadSubject: null,
    test: true,
  };
}

interface Chosen {
  readonly inForce: LimitInForce;
  readonly level: TrendPoint;
}

/** Why no limit of a point can be shown in an alarm. */
export function whyNone(limits: readonly LimitInForce[]): string {
  const why = limits.flatMap(({ limit, now }) => ('unknown' in now ? [`${limit.id}: ${now.unknown}`] : []));
  return why.length === 0 ? 'the newest recording has no level of a band with a limit' : why.join('; ');
}

function mostUsed(
  view: SiteView,
  point: Point,
  measurement: StoredMeasurement,
  limits: readonly LimitInForce[],
): Chosen | null {
  const used = limits.flatMap((inForce) => {
    const bandId = view.ids.bandId(point.machineId, point.id, inForce.limit.bandId);
    const level = measurement.levels.find((one) => one.bandId === bandId);
    return level === undefined || 'unknown' in inForce.now
      ? []
      : [{ inForce, level, share: shareOfAlert(level.level, limitFactsNow(inForce)) ?? 0 }];
  });
  return used.sort((a, b) => b.share - a.share)[0] ?? null;
}

interface Subject extends Chosen {
  readonly machine: Machine;
  readonly point: Point;
  readonly pointId: number;
  readonly measurement: StoredMeasurement;
}

async function alarmOf(reader: Reader, view: SiteView, subject: Subject): Promise<AlarmFacts> {
  const { machine, point, pointId, measurement, inForce, level } = subject;
  const { limit } = inForce;
  const facts = limitFactsNow(inForce);
  const { bandId, seriesId, conditionId, usedMs } = level;
  const series = (await seriesOfPoint(reader, pointId)).find(({ id }) => id === seriesId);
  const band = point.bands.find(({ id }) => id === limit.bandId);
  const everyMs = levelEveryMs(point);
  const before = await levelsBefore(reader, { pointId, bandId, seriesId, conditionId, usedMs, everyMs });
  return {
    kind: 'alarm',
    number: 0,
    standing: 'unacknowledged',
    sinceMs: usedMs,
    recordings: 1,
    respondByMs: null,
    acknowledgedBy: null,
    acknowledgedMs: null,
    suppressedUntilMs: null,
    severity: facts.alert === null ? 'danger' : 'alert',
    event: 'raised',
    machine: machineFacts(view, machine.id),
    point: pointFacts(view, machine.id, point.id),
    band: bandFacts(limit.bandId, band, series, machine),
    limit: facts,
    level: levelFacts(measurement, level),
    dangerUnconfirmed: false,
    evidence: await evidenceFacts(reader, measurement.id),
    change: null,
    action: limit.action,
    zone: await alarmZone(reader, view, { machine, point, bandId: limit.bandId, measurement, before }),
    before,
    trend: await trendOfLevel(reader, view, { point, measurement, level, knownUntilMs: usedMs }),
    lines: await linesFacts(reader, point, measurement),
    otherPoints: await otherPoints(reader, view, machine, { pointId: point.id, usedMs }),
    recording: await recordingFacts(reader, measurement, { late: false, fromBacklog: false }),
  };
}
