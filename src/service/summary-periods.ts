import type { SummaryFacts, SummaryServiceFacts } from '../advisory/summary-facts.ts';
import { localDate } from '../config/local-time.ts';
import { alarmByNumber, livesRaised, loadAlarms } from '../store/alarms.ts';
import { readMark } from '../store/intake-marks.ts';
import { readJournal } from '../store/journal.ts';
import type { Reader } from '../store/lent-connection.ts';
import { arrivedSince, countMeasured, livesEndedSince } from '../store/period-counts.ts';
import { countByOutcome } from '../store/recordings.ts';
import type { PointArrivals } from '../store/sources.ts';
import { outboxCounts } from '../store/threads.ts';
import { countRefusedSince, lastAcceptedMs } from '../store/waiting-mail.ts';
import type { DiskRoom } from './disk-room.ts';
import { machineFacts, pointFacts } from './fact-names.ts';
import type { SiteView } from './site-view.ts';

/** What came, what was raised, what the service itself did, in the day and the week before the summary. */

const dayMs = 86_400_000;
const mostLives = 5000;

export interface Day {
  readonly view: SiteView;
  readonly nowMs: number;
  readonly sinceMs: number;
  /** Nothing was expected before the watch began. */
  readonly watchedFromMs: number;
}

/** Counted by point, each at most once an interval, so that one point's surplus never hides another's gap. */
export async function receivedOfExpected(
  reader: Reader,
  day: Day,
  arrivals: ReadonlyMap<number, PointArrivals>,
): Promise<{ readonly received: number; readonly expected: number }> {
  let received = 0;
  let expected = 0;
  const lengthMs = day.nowMs - Math.max(day.sinceMs, day.watchedFromMs);
  for (const point of day.view.points) {
    const pointId = day.view.ids.pointId(point.machineId, point.id);
    const { expectedEveryMs, settleMs } = point.recordings;
    const due = Math.max(0, Math.floor(lengthMs / expectedEveryMs));
    // The last one may be up to an interval old and still the newest that there can be.
    const newestMs = arrivals.get(pointId)?.newestUsedMs ?? null;
    const inStep =
      newestMs !== null && newestMs <= day.nowMs && day.nowMs - newestMs < 1.5 * expectedEveryMs + settleMs;
    const toMs = inStep ? newestMs : day.nowMs;
    const came = await countMeasured(reader, pointId, { afterMs: toMs - lengthMs, toMs });
    expected += due;
    received += Math.min(came, due);
  }
  return { received, expected };
}

export async function otherFiles(
  reader: Reader,
  day: Day,
  unassignedNow: number,
): Promise<Omit<SummaryFacts['recordings'], 'received' | 'expected'>> {
  const counts = await countByOutcome(reader, day.sinceMs);
  const { late } = await arrivedSince(reader, day.sinceMs);
  return {
    late,
    repeats: counts.repeat,
    quarantined: counts.quarantined,
    unassigned: counts.unassigned + unassignedNow,
  };
}

/** Alarms of limits raised on the local day before, in seven days, and where most. */
export async function historyOf(reader: Reader, { view, nowMs }: Day): Promise<SummaryFacts['history']> {
  const { timeZone } = view.site;
  const range = { fromMs: nowMs - 7 * dayMs, toMs: nowMs, limit: mostLives };
  const lives = (await livesRaised(reader, range)).filter(({ key }) => key.startsWith('limit:'));
  const today = localDate(nowMs, timeZone);
  // Noon of today less a day is yesterday, also where a clock change makes a day of 23 or 25 hours.
  const yesterdayDate = localDate(Date.parse(`${today}T12:00:00Z`) - dayMs, 'UTC');
  const yesterday = lives.filter(({ raisedWallMs }) => localDate(raisedWallMs, timeZone) === yesterdayDate);
  const alarms = await loadAlarms(reader, [...new Set(lives.map(({ key }) => key))]);
  const places = new Map<string, { machineId: string; pointId: string; count: number }>();
  for (const { key } of lives) {
    const subject = alarms.get(key)?.subject;
    if (subject?.kind !== 'limit') continue;
    const { machineId, pointId } = subject;
    const place = places.get(`${machineId}/${pointId}`) ?? { machineId, pointId, count: 0 };
    place.count++;
    places.set(`${machineId}/${pointId}`, place);
  }
  const frequent = [...places.values()].sort((a, b) => b.count - a.count).slice(0, 10);
  return {
    yesterday: yesterday.length,
    week: lives.length,
    frequent: frequent.map(({ machineId, pointId, count }) => ({
      machine: machineFacts(view, machineId),
      point: pointFacts(view, machineId, pointId),
      count,
    })),
  };
}

/** Alarms closed since the last summary because their limit left the site file. */
export async function limitsRemovedSince(
  reader: Reader,
  sinceMs: number,
): Promise<SummaryFacts['limitsRemoved']> {
  const removed: { number: number; what: string }[] = [];
  for (const { number } of await livesEndedSince(reader, sinceMs)) {
    const last = await readJournal(reader, { number, limit: 5 });
    if (!last.some(({ event }) => event === 'limit-removed')) continue;
    const subject = (await alarmByNumber(reader, number))?.alarm.subject;
    if (subject?.kind !== 'limit') continue;
    removed.push({ number, what: `${subject.machineId}/${subject.pointId} ${subject.limitId}` });
  }
  return removed;
}

export const backupMark = 'last-backup-ms';

export async function serviceNow(
  reader: Reader,
  day: Day,
  upSinceMs: number,
  disk: DiskRoom,
): Promise<SummaryServiceFacts> {
  const { deliveries, lastAnswer } = await outboxCounts(reader);
  const backup = await readMark(reader, backupMark);
  return {
    upSinceMs,
    mailWaiting: deliveries.waiting,
    mailFailed: await countRefusedSince(reader, day.sinceMs),
    mailLastAcceptedMs: await lastAcceptedMs(reader),
    mailLastAnswer: lastAnswer === null || lastAnswer.state === 'accepted' ? null : lastAnswer.answer,
    diskDaysLeft: disk.daysLeft,
    diskFreeBytes: disk.freeBytes,
    lastBackupMs: backup === null ? null : Number(backup),
  };
}
