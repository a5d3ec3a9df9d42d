import type { CatchUpFacts, PassedAlarm } from '../advisory/notice-facts.ts';
import { worseSeverity } from '../advisory/outbox.ts';
import { type RecipientNow, reachOf } from '../advisory/recipients.ts';
import type { Severity } from '../config/site.ts';
import { alarmByNumber, type StandingLife } from '../store/alarms.ts';
import { readJournal } from '../store/journal.ts';
import { isLedgersOwn } from '../store/ledger-error.ts';
import type { Reader } from '../store/lent-connection.ts';
import type { UntoldEvent } from '../store/messages.ts';
import { highestLevel } from '../store/past-levels.ts';
import { countEvaluated } from '../store/period-counts.ts';
import {
  bandFacts,
  findMachine,
  limitOf,
  machineFacts,
  machineOfId,
  pointFacts,
  siteFacts,
} from './fact-names.ts';
import type { SiteView } from './site-view.ts';
import { stillStands } from './standing-facts.ts';

/**
 * What came and went before anybody could be told: during a backlog of recordings, or while no mail left for longer
 * than `catch_up_after`. It is told in one mail; what still stands is mailed by itself, whatever its age.
 */
export interface Sorted {
  readonly toTell: readonly UntoldEvent[];
  readonly backlog: readonly UntoldEvent[];
  readonly waitedLong: readonly UntoldEvent[];
}

export async function sortEvents(
  reader: Reader,
  events: readonly UntoldEvent[],
  nowMs: number,
  catchUpAfterMs: number,
): Promise<Sorted> {
  const toTell: UntoldEvent[] = [];
  const backlog: UntoldEvent[] = [];
  const waitedLong: UntoldEvent[] = [];
  for (const event of events) {
    const old = nowMs - event.wallMs > catchUpAfterMs;
    const isOver =
      event.number !== null && (event.fromBacklog || old) && (await isKnownOver(reader, event.number));
    const isNews = event.event === 'limit-removed' || event.event === 'exceeded-came-late';
    if (!isOver || isNews) toTell.push(event);
    else (event.fromBacklog ? backlog : waitedLong).push(event);
  }
  return { toTell, backlog, waitedLong };
}

/** False where that cannot be read: then it is told by itself, in plain words if it must be. */
async function isKnownOver(reader: Reader, number: number): Promise<boolean> {
  try {
    const life = await alarmByNumber(reader, number);
    return life !== null && !stillStands(life);
  } catch (error) {
    if (isLedgersOwn(error)) throw error;
    return false;
  }
}

const hourMs = 3_600_000;

/** Facts of all the lives that these events belong to; each recipient gets those that concern him. */
export async function catchUpFacts(
  reader: Reader,
  view: SiteView,
  events: readonly UntoldEvent[],
  nowMs: number,
): Promise<CatchUpFacts> {
  const passed: PassedAlarm[] = [];
  for (const number of new Set(events.map((event) => event.number))) {
    const life = number === null ? null : await alarmByNumber(reader, number);
    if (life === null) continue;
    const severities = events.filter((event) => event.number === number).map(({ severity }) => severity);
    passed.push(await passedAlarm(reader, view, life, severities.reduce(worseSeverity)));
  }
  const firstWallMs = Math.min(nowMs, ...events.map(({ wallMs }) => wallMs));
  const fromMs = Math.min(nowMs, ...passed.map(({ beganMs }) => beganMs));
  const toMs = Math.max(fromMs, ...passed.map(({ endedMs }) => endedMs ?? 0));
  return {
    site: siteFacts(view),
    writtenMs: nowMs,
    reason: events.every(({ fromBacklog }) => fromBacklog) ? 'backlog' : 'mail-waited',
    fromMs,
    toMs,
    // A backlog is complete at most a quarter of an hour after its first file; decisions follow.
    recordings: await countEvaluated(reader, { sinceArrivedMs: firstWallMs - hourMs, fromMs, toMs }),
    passed,
  };
}

async function passedAlarm(
  reader: Reader,
  view: SiteView,
  { alarm, life }: StandingLife,
  severity: Severity,
): Promise<PassedAlarm> {
  const { subject } = alarm;
  const journal = await readJournal(reader, { number: life.number, limit: 200 });
  const returned = journal.find(({ event }) => event === 'returned');
  const endedMs = returned?.usedMs ?? life.endedWallMs ?? life.raisedWallMs;
  const beganMs = Math.min(life.raisedUsedMs ?? life.raisedWallMs, endedMs);
  const { machineId, pointId } = subject;
  const shared = {
    number: life.number,
    severity,
    machine: machineId === null ? null : machineFacts(view, machineId),
    point: machineId === null || pointId === null ? null : pointFacts(view, machineId, pointId),
    beganMs,
    endedMs,
  };
  if (subject.kind === 'trouble') return { ...shared, band: null, highest: null, trouble: subject.trouble };
  const point = view.point(`${subject.machineId}/${subject.pointId}`);
  const band = point?.bands.find(({ id }) => id === subject.bandId);
  const lower = limitOf(point, subject.limitId)?.side === 'lower';
  const highest =
    band === undefined || lower || alarm.pointId === null
      ? null
      : await highestLevel(reader, {
          pointId: alarm.pointId,
          bandId: view.ids.bandId(subject.machineId, subject.pointId, band.id),
          fromMs: beganMs,
          toMs: endedMs,
        });
  return {
    ...shared,
    band: bandFacts(subject.bandId, band, undefined, findMachine(view, subject.machineId)),
    highest,
    trouble: null,
  };
}

/** By address: the passed alarms that concern it; nobody gets an empty mail. */
export function passedFor(
  view: SiteView,
  recipients: readonly RecipientNow[],
  passed: readonly PassedAlarm[],
): Map<string, PassedAlarm[]> {
  const byAddress = new Map<string, PassedAlarm[]>();
  for (const one of passed) {
    const machine = one.machine === null ? null : (findMachine(view, one.machine.id) ?? null);
    for (const address of reachOf(recipients, machine, one.severity, true).addresses)
      byAddress.set(address, [...(byAddress.get(address) ?? []), one]);
  }
  return byAddress;
}

/** Everybody who takes the severity of any of the events at this hour. */
export function addressesFor(
  view: SiteView,
  recipients: readonly RecipientNow[],
  machineId: number | null,
  events: readonly { readonly severity: Severity }[],
): string[] {
  const machine = machineId === null ? null : (machineOfId(view, machineId) ?? null);
  const severities = new Set(events.map(({ severity }) => severity));
  return [
    ...new Set([...severities].flatMap((severity) => reachOf(recipients, machine, severity).addresses)),
  ];
}
