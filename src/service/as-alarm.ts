import type { AlarmFacts, AlarmMailFacts } from '../advisory/facts.ts';
import { shareOfAlert } from '../advisory/ranking.ts';
import type { Limit, Machine, Point } from '../config/site.ts';
import type { Reader } from '../store/lent-connection.ts';
import { newestMeasurement, type StoredMeasurement } from '../store/read-measurements.ts';
import { seriesOfPoint, type TrendPoint } from '../store/read-trends.ts';
import { evidenceFacts } from './evidence-now.ts';
import { bandFacts, limitFacts, machineFacts, pointFacts, siteFacts } from './fact-names.ts';
import { levelFacts, levelsBefore, linesFacts, otherPoints, recordingFacts } from './level-facts.ts';
import type { SiteView } from './site-view.ts';
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
  const chosen = measurement === null ? null : mostUsed(view, point, measurement);
  if (measurement === null || chosen === null) {
    return {
      refused: `there is no level of ${machine.id}/${point.id} yet; put a recording into the drop folder`,
    };
  }
  return {
    site: siteFacts(view),
    machine: machineFacts(view, machine.id),
    writtenMs: nowMs,
    alarms: [await alarmOf(reader, view, { machine, point, pointId, measurement, ...chosen })],
    troubles: [],
    threadSubject: null,
    test: true,
  };
}

interface Chosen {
  readonly limit: Limit;
  readonly level: TrendPoint;
}

function mostUsed(view: SiteView, point: Point, measurement: StoredMeasurement): Chosen | null {
  const used = point.limits.flatMap((limit) => {
    const bandId = view.ids.bandId(point.machineId, point.id, limit.bandId);
    const level = measurement.levels.find((one) => one.bandId === bandId);
    return level === undefined
      ? []
      : [{ limit, level, share: shareOfAlert(level.level, limitFacts(limit)) ?? 0 }];
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
  const { machine, point, pointId, measurement, limit, level } = subject;
  const { bandId, seriesId, usedMs } = level;
  const series = (await seriesOfPoint(reader, pointId)).find(({ id }) => id === seriesId);
  const band = point.bands.find(({ id }) => id === limit.bandId);
  const everyMs = point.recordings.expectedEveryMs;
  const before = await levelsBefore(reader, { pointId, bandId, seriesId, usedMs, everyMs });
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
    severity: limit.alert === null ? 'danger' : 'alert',
    event: 'raised',
    machine: machineFacts(view, machine.id),
    point: pointFacts(view, machine.id, point.id),
    band: bandFacts(limit.bandId, band, series, machine),
    limit: limitFacts(limit),
    level: levelFacts(measurement, level),
    dangerUnconfirmed: false,
    evidence: await evidenceFacts(reader, measurement.id),
    change: null,
    action: limit.action,
    zone: await alarmZone(reader, view, { machine, point, bandId: limit.bandId, measurement, before }),
    before,
    trend: null,
    lines: await linesFacts(reader, point, measurement),
    otherPoints: await otherPoints(reader, view, machine, { pointId: point.id, usedMs }),
    recording: await recordingFacts(reader, measurement, { late: false, fromBacklog: false }),
  };
}
