import type { AlarmFacts, LevelFacts, LimitFacts, RecordingFacts, StandingFacts } from '../advisory/facts.ts';
import { levelEveryMs } from '../config/meaning.ts';
import type { Limit, Machine, Point } from '../config/site.ts';
import { normalState } from '../detection/alarm.ts';
import { alarmByNumber, loadAlarms, type StandingLife, type StoredAlarm } from '../store/alarms.ts';
import { type JournalRow, readJournal } from '../store/journal.ts';
import type { Reader } from '../store/lent-connection.ts';
import type { UntoldEvent } from '../store/messages.ts';
import { bandOfLimit } from '../store/past-levels.ts';
import { askedSinceMs } from '../store/period-counts.ts';
import {
  measurementsOfRecording,
  newestMeasurement,
  type StoredMeasurement,
} from '../store/read-measurements.ts';
import { seriesOfPoint, type TrendPoint } from '../store/read-trends.ts';
import { chatterFacts } from './chattering.ts';
import { evidenceFacts } from './evidence-now.ts';
import {
  bandFacts,
  findMachine,
  type LimitSubject,
  limitOf as limitInSite,
  limitOfKey,
  machineFacts,
  pointFacts,
} from './fact-names.ts';
import { levelFacts, levelsBefore, linesFacts, otherPoints, recordingFacts } from './level-facts.ts';
import { limitOfLife, limitOfRow } from './limit-of-journal.ts';
import { limitFactsNow, limitsInForce } from './limits-in-force.ts';
import type { SiteView } from './site-view.ts';
import { standingFacts } from './standing-facts.ts';
import { trendOfLevel } from './trend-facts.ts';
import { alarmZone } from './zone-facts.ts';

/** From one event of a limit, due to be told, to everything that its mail says. */

interface Known {
  readonly event: UntoldEvent;
  readonly row: JournalRow | undefined;
  readonly subject: LimitSubject;
  /** Null where the alarm never stood: a level over its limit that came late. */
  readonly standing: StandingLife | null;
  readonly alarm: StoredAlarm | null;
  readonly machine: Machine | undefined;
  readonly point: Point | undefined;
  /** The ledger's ids; null where there is nothing of that name in it. */
  readonly pointId: number | null;
  readonly bandId: number | null;
}

interface Measured {
  readonly measurement: StoredMeasurement;
  readonly level: TrendPoint | undefined;
}

export async function alarmFacts(reader: Reader, view: SiteView, event: UntoldEvent): Promise<AlarmFacts> {
  const known = await knownOf(reader, view, event);
  const { subject, point, machine, row } = known;
  const limit = limitInSite(point, subject.limitId);
  const measured = await measuredFor(reader, known);
  const seriesId = measured?.level?.seriesId;
  const series =
    known.pointId === null || seriesId === undefined
      ? undefined
      : (await seriesOfPoint(reader, known.pointId)).find(({ id }) => id === seriesId);
  const usedMs = measured?.measurement.usedMs ?? row?.usedMs ?? event.wallMs;
  const state = known.standing?.alarm.number === event.number ? known.standing?.alarm.state : undefined;
  const past = await before(reader, known, measured);
  return {
    ...(await standingOf(reader, known, limit?.respondWithinMs ?? null, usedMs)),
    kind: 'alarm',
    severity: event.severity === 'danger' ? 'danger' : 'alert',
    event: event.event,
    machine: machineFacts(view, subject.machineId),
    point: pointFacts(view, subject.machineId, subject.pointId),
    band: bandFacts(
      subject.bandId,
      point?.bands.find(({ id }) => id === subject.bandId),
      series,
      machine,
    ),
    limit: await limitOf(reader, view, known, measured, limit),
    level: levelOf(known, measured, usedMs),
    dangerUnconfirmed: state?.pending?.to === 'danger',
    evidence: measured === null ? [] : await evidenceFacts(reader, measured.measurement.id),
    change: null,
    action: limit?.action ?? null,
    zone:
      measured === null
        ? null
        : await alarmZone(reader, view, {
            machine,
            point,
            bandId: subject.bandId,
            measurement: measured.measurement,
            before: past,
          }),
    before: past,
    chattering: chatterFacts(row?.reason.chattering, limit),
    trend:
      point === undefined || measured === null
        ? null
        : await trendOfLevel(reader, view, {
            point,
            ...measured,
            knownUntilMs: Math.max(usedMs, event.wallMs),
          }),
    lines: measured === null ? null : await linesFacts(reader, point, measured.measurement),
    otherPoints: await otherPoints(reader, view, machine, { pointId: subject.pointId, usedMs }),
    recording: await recordingOf(reader, known, measured, usedMs),
  };
}

async function knownOf(reader: Reader, view: SiteView, event: UntoldEvent): Promise<Known> {
  const standing = event.number === null ? null : await alarmByNumber(reader, event.number);
  const key = event.key ?? '';
  const alarm = standing?.alarm ?? (await loadAlarms(reader, [key])).get(key) ?? null;
  const subject = alarm?.subject.kind === 'limit' ? alarm.subject : limitOfKey(view, key);
  const { machineId, pointId, bandId } = subject;
  const point = view.point(`${machineId}/${pointId}`);
  const inSite = point?.bands.some(({ id }) => id === bandId) === true;
  const limitId = alarm?.limitId ?? null;
  return {
    event,
    row: (await readJournal(reader, { afterSequence: event.journalSequence - 1, limit: 1 }))[0],
    subject,
    standing,
    alarm,
    machine: findMachine(view, machineId),
    point,
    pointId: alarm?.pointId ?? (point === undefined ? null : view.ids.pointId(machineId, pointId)),
    bandId: inSite
      ? view.ids.bandId(machineId, pointId, bandId)
      : limitId === null
        ? null
        : await bandOfLimit(reader, limitId),
  };
}

/** The measurement that caused the event; where no recording did (a shelf's end), the newest one. */
async function measuredFor(reader: Reader, { row, pointId, bandId }: Known): Promise<Measured | null> {
  if (pointId === null) return null;
  const recordingId = row?.recordingId ?? null;
  const own =
    recordingId === null
      ? undefined
      : (await measurementsOfRecording(reader, recordingId)).find((one) => one.pointId === pointId);
  const measurement = own ?? (await newestMeasurement(reader, pointId, { evaluated: true }));
  if (measurement === null) return null;
  return { measurement, level: measurement.levels.find((level) => level.bandId === bandId) };
}

/** A level that is not stored (it gave way to another recording of the same time) is known from the event alone. */
function levelOf({ event, alarm }: Known, measured: Measured | null, usedMs: number): LevelFacts {
  if (measured?.level !== undefined) return levelFacts(measured.measurement, measured.level);
  const level = event.level ?? alarm?.state.toldLevel ?? 0;
  return {
    usedMs,
    level,
    intervalLow: level,
    intervalHigh: level,
    confidencePercent: measured?.measurement.confidencePercent ?? 95,
    atLeast: false,
  };
}

async function before(
  reader: Reader,
  { pointId, bandId, point }: Known,
  measured: Measured | null,
): Promise<AlarmFacts['before']> {
  const level = measured?.level;
  if (pointId === null || bandId === null || level === undefined)
    return { last: [], dayBefore: null, weekBefore: null, baseline: null };
  const everyMs = point === undefined ? 3_600_000 : levelEveryMs(point);
  const { seriesId, conditionId, usedMs } = level;
  return levelsBefore(reader, { pointId, bandId, seriesId, conditionId, usedMs, everyMs });
}

async function standingOf(
  reader: Reader,
  known: Known,
  respondWithinMs: number | null,
  usedMs: number,
): Promise<StandingFacts> {
  const { event, standing, alarm } = known;
  if (standing !== null) {
    const { number } = standing.life;
    const askedMs = (await askedSinceMs(reader, [number])).get(number) ?? event.wallMs;
    return standingFacts(reader, standing, { askedMs, respondWithinMs });
  }
  return {
    number: 0,
    standing: 'normal',
    sinceMs: usedMs,
    recordings: Math.max(1, (alarm?.state ?? normalState).count),
    respondByMs: respondWithinMs === null ? null : event.wallMs + respondWithinMs,
    acknowledgedBy: null,
    acknowledgedMs: null,
    suppressedUntilMs: null,
  };
}

async function recordingOf(
  reader: Reader,
  { event }: Known,
  measured: Measured | null,
  usedMs: number,
): Promise<RecordingFacts> {
  if (measured !== null) {
    const late = event.event === 'exceeded-came-late';
    return recordingFacts(reader, measured.measurement, { late, fromBacklog: event.fromBacklog });
  }
  return {
    fileName: null,
    startMs: usedMs,
    arrivedMs: event.wallMs,
    arrival: 'in-time',
    durationS: 0,
    speed: null,
    loadPercent: null,
    averaging: null,
    quality: [],
  };
}

/**
 * The limit as it stood when the event was decided, which the journal has. An event that was none of a recording (a shelf's
 * end) has the limit as it stands now, and where it has left the site file, as it stood last.
 */
async function limitOf(
  reader: Reader,
  view: SiteView,
  { event, row, subject, point }: Known,
  measured: Measured | null,
  limit: Limit | undefined,
): Promise<LimitFacts> {
  const { limitId } = subject;
  const decided = limitOfRow(row?.reason ?? {}, limitId);
  if (decided !== null) return { reasons: limit?.reasons ?? null, ...decided };
  if (limit !== undefined && point !== undefined) {
    const all = await limitsInForce(reader, view, point, measured?.measurement ?? null);
    const own = all.find((one) => one.limit.id === limitId);
    if (own !== undefined && !('unknown' in own.now)) return limitFactsNow(own);
  }
  const last = await limitOfLife(reader, event.number, limitId);
  return last ?? { id: limitId, side: limit?.side ?? 'upper', alert: null, danger: null };
}
