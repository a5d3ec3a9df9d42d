import type { Site } from '../config/site.ts';
import type { AlarmStanding } from '../detection/alarm.ts';
import { standing } from '../detection/alarm-state.ts';
import { standingAlarms } from '../store/alarms.ts';
import type { Reader } from '../store/lent-connection.ts';
import type { StoredRecording } from '../store/recordings.ts';
import {
  countUntold,
  type LastMailAnswer,
  lastMailAnswer,
  lastStartedMs,
  newestTaken,
} from '../store/service-state.ts';
import { arrivalsOf } from '../store/sources.ts';
import { readSummary } from '../store/summaries.ts';
import { type OutOfService, placesOutOfService, suppressedAlarms } from '../store/suppressions.ts';
import { waitingMail } from '../store/waiting-mail.ts';
import { type Health, stuckAfterMs } from './health.ts';
import { type UnwatchedLimit, unwatchedLimits } from './limits-in-force.ts';
import { readersView } from './readers-view.ts';
import { severityNow } from './standing-list.ts';

export interface OverduePoint {
  readonly machineId: string;
  readonly pointId: string;
  readonly number: number;
  /** Null: nothing ever came from it. */
  readonly lastArrivedMs: number | null;
}

/** What the ledger and the service's own word amount to. */
export interface Status {
  readonly running: boolean;
  /** It runs, but has finished no round for longer than a round and its pause may take. */
  readonly stuck: boolean;
  readonly startedMs: number | null;
  /** Last finished round of this run. */
  readonly roundMs: number | null;
  /** Of the run that goes on, or of the last one. */
  readonly health: Health | null;
  /** False: the service works by another text of the site file than the one that was read here. */
  readonly siteFileInForce: boolean | null;
  readonly newest: StoredRecording | null;
  readonly overdue: readonly OverduePoint[];
  readonly standing: { readonly danger: number; readonly alert: number; readonly trouble: number };
  /** Of these and of what has come back: how many are held back, by what. */
  readonly held: { readonly shelved: number; readonly byDesign: number; readonly outOfService: number };
  readonly outOfService: readonly OutOfService[];
  /** Limits that cannot be reckoned now; null: the ledger has not taken over this text of the site file. */
  readonly unwatched: readonly UnwatchedLimit[] | null;
  readonly mailsWaiting: number;
  readonly eventsGathered: number;
  readonly lastMail: LastMailAnswer | null;
  readonly lastSummary: { readonly localDate: string; readonly createdMs: number } | null;
}

/** `running`: whether somebody holds the ledger's owner lock; `health` as read from the data folder. */
export async function statusOf(
  reader: Reader,
  site: Site,
  seen: { readonly running: boolean; readonly health: Health | null; readonly nowMs: number },
): Promise<Status> {
  const { running, health, nowMs } = seen;
  const startedMs = await lastStartedMs(reader);
  // A file of an earlier run says nothing of this one.
  const roundMs =
    health === null || (startedMs !== null && health.roundMs < startedMs) ? null : health.roundMs;
  const living = Math.max(roundMs ?? 0, startedMs ?? 0);
  const summary = await readSummary(reader);
  const view = await readersView(reader, site);
  const lives = await standingAlarms(reader);
  const held = (await suppressedAlarms(reader)).map(({ state }) => standing(state));
  const heldBy = (what: AlarmStanding) => held.filter((one) => one === what).length;
  const count = (severity: string) => lives.filter((one) => severityNow(one) === severity).length;
  return {
    running,
    stuck: running && nowMs - living > site.timings.sweepEveryMs + stuckAfterMs,
    startedMs,
    roundMs,
    health,
    siteFileInForce:
      running && health !== null && roundMs !== null ? health.configVersion === site.configVersion : null,
    newest: await newestTaken(reader),
    overdue: await overduePoints(reader, lives),
    standing: { danger: count('danger'), alert: count('alert'), trouble: count('trouble') },
    held: {
      shelved: heldBy('shelved'),
      byDesign: heldBy('suppressed'),
      outOfService: heldBy('out-of-service'),
    },
    outOfService: await placesOutOfService(reader),
    unwatched: view === null ? null : await unwatchedLimits(reader, view, nowMs),
    mailsWaiting: (await waitingMail(reader)).count,
    eventsGathered: await countUntold(reader),
    lastMail: await lastMailAnswer(reader),
    lastSummary: summary && { localDate: summary.localDate, createdMs: summary.createdMs },
  };
}

async function overduePoints(
  reader: Reader,
  lives: Awaited<ReturnType<typeof standingAlarms>>,
): Promise<OverduePoint[]> {
  const arrivals = await arrivalsOf(reader);
  return lives.flatMap(({ alarm, life }) => {
    const { subject, state, pointId } = alarm;
    if (subject.kind !== 'trouble' || subject.trouble !== 'overdue' || state.condition !== 'trouble')
      return [];
    const { machineId, pointId: id } = subject;
    if (machineId === null || id === null) return [];
    const lastArrivedMs = pointId === null ? null : (arrivals.get(pointId)?.lastArrivedMs ?? null);
    return [{ machineId, pointId: id, number: life.number, lastArrivedMs }];
  });
}
