import type { AlarmFacts, TroubleFacts } from '../advisory/facts.ts';
import { floodKey } from '../advisory/flood.ts';
import { type FloodFacts, floodMail, floodSubject } from '../advisory/flood-mail.ts';
import { isWorse, priorityOf } from '../advisory/outbox.ts';
import { alarmsArrived, floodsSince, mailIdsOfGroup } from '../store/floods.ts';
import type { Reader } from '../store/lent-connection.ts';
import type { UntoldEvent } from '../store/messages.ts';
import { addressesFor } from './catch-up.ts';
import { alarmMailFacts, type Draft, type DraftFrom, identityOf, type MailTo, worstOf } from './draft.ts';
import { siteFacts } from './fact-names.ts';

/** Events of one mail; what is beyond them, danger first, is told in the next. */
const mostEvents = 300;

/** An alarm or trouble of the flood, and whom its events concern. */
interface Told {
  readonly item: AlarmFacts | TroubleFacts;
  readonly addresses: ReadonlySet<string>;
}

/**
 * The mail of what came in a flood. Each recipient gets what concerns him; that it is over is told to whoever had a mail of
 * it before, and to whom the rest concerns.
 */
export async function draftFlood(
  reader: Reader,
  from: DraftFrom,
  group: string,
  gathered: readonly UntoldEvent[],
): Promise<Draft> {
  const events = mostUrgent(gathered);
  const alarms = events.filter(({ event }) => event !== 'flood-ended');
  const all = await toldOf(reader, from, alarms);
  const course = await courseOf(reader, from, group, events);
  const earlier = await mailIdsOfGroup(reader, group);
  const mails: MailTo[] = [];
  for (const recipient of new Set([...all.flatMap(({ addresses }) => [...addresses]), ...earlier.keys()])) {
    const before = earlier.get(recipient) ?? [];
    const own = all.filter(({ addresses }) => addresses.has(recipient));
    if (own.length === 0 && (before.length === 0 || alarms.length === events.length)) continue;
    const mail = floodMail({ ...course, ...itemsOf(own), goesOn: before.length > 0 });
    mails.push({ recipient, mail, earlier: before });
  }
  return {
    kind: 'flood',
    identity: identityOf(from, 'flood', events),
    priority: priorityOf('flood', worstOf(alarms)),
    groupKey: group,
    subject: floodSubject({ ...course, ...itemsOf(all), goesOn: earlier.size > 0 }),
    tells: events.map(({ id }) => id),
    mails,
    thread: null,
  };
}

function itemsOf(told: readonly Told[]): Pick<FloodFacts, 'alarms' | 'troubles'> {
  const items = told.map(({ item }) => item);
  return {
    alarms: items.filter((item) => item.kind === 'alarm'),
    troubles: items.filter((item) => item.kind === 'trouble'),
  };
}

function mostUrgent(events: readonly UntoldEvent[]): UntoldEvent[] {
  if (events.length <= mostEvents) return [...events];
  const lastFirst = (a: UntoldEvent, b: UntoldEvent) =>
    isWorse(a.severity, b.severity) ? -1 : isWorse(b.severity, a.severity) ? 1 : a.id - b.id;
  return events
    .filter(({ event }) => event !== 'flood-ended')
    .sort(lastFirst)
    .slice(0, mostEvents)
    .sort((a, b) => a.id - b.id);
}

/** What happened to one alarm makes one item. */
async function toldOf(reader: Reader, from: DraftFrom, events: readonly UntoldEvent[]): Promise<Told[]> {
  const { view, recipients, nowMs } = from;
  const byAlarm = new Map<string, UntoldEvent[]>();
  for (const event of events) {
    const about = `${event.key} ${event.number}`;
    byAlarm.set(about, [...(byAlarm.get(about) ?? []), event]);
  }
  const told: Told[] = [];
  for (const own of byAlarm.values()) {
    const machineId = own[0]?.machineId ?? null;
    const { alarms, troubles } = await alarmMailFacts(reader, view, machineId, own, nowMs);
    const addresses = addressesFor(view, recipients, machineId, own);
    for (const item of [...alarms, ...troubles])
      told.push({ item, addresses: new Set([...addresses, ...(item.reminder?.thenTo ?? [])]) });
  }
  return told;
}

async function courseOf(
  reader: Reader,
  { view, nowMs }: DraftFrom,
  group: string,
  events: readonly UntoldEvent[],
): Promise<Omit<FloodFacts, 'alarms' | 'troubles' | 'goesOn'>> {
  const oldestMs = Math.min(nowMs, ...events.map(({ wallMs }) => wallMs));
  const flood = (await floodsSince(reader, oldestMs)).find(({ id }) => floodKey(id) === group);
  const fromMs = flood?.fromMs ?? oldestMs;
  const endedMs = flood?.endedMs ?? null;
  const { count } = await alarmsArrived(reader, { afterMs: fromMs - 1, toMs: endedMs ?? nowMs });
  return { site: siteFacts(view), writtenMs: nowMs, fromMs, endedMs, alarmsInAll: count };
}
