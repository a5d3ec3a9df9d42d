import { type Flood, floodKey, floodOf, floodRule } from '../advisory/flood.ts';
import { endOfWithinMs, isWithin } from '../advisory/hours.ts';
import type { EventDue } from '../advisory/outbox.ts';
import { type RecipientNow, reachOf, recipientsFor } from '../advisory/recipients.ts';
import type { MailSettings } from '../config/site.ts';
import { floodsSince, hasMessages } from '../store/floods.ts';
import type { Reader } from '../store/lent-connection.ts';
import type { UntoldEvent } from '../store/messages.ts';
import { machineOfId } from './fact-names.ts';
import type { SiteView } from './site-view.ts';

/** Which events may leave now, with which they travel, and until when the others wait for somebody's hours or the morning. */

export interface Gathered extends EventDue {
  readonly event: UntoldEvent;
}

export interface Leaving {
  readonly leaving: readonly Gathered[];
  /** Somebody takes these, but nobody at this hour. */
  readonly waiting: readonly Gathered[];
}

export interface LeavingFrom {
  readonly view: SiteView;
  readonly mail: MailSettings;
  readonly recipients: readonly RecipientNow[];
  readonly nowMs: number;
}

/** A flood with whether a mail of it was made. */
interface FloodNow extends Flood {
  readonly told: boolean;
}

/** Each by itself: its machine's, or those of the flood in whose time it came. */
export async function leavingNow(
  reader: Reader,
  from: LeavingFrom,
  events: readonly UntoldEvent[],
): Promise<Leaving> {
  const oldestMs = Math.min(from.nowMs, ...events.map(({ wallMs }) => wallMs));
  const floods: FloodNow[] = [];
  for (const flood of await floodsSince(reader, oldestMs))
    floods.push({ ...flood, told: await hasMessages(reader, floodKey(flood.id)) });
  const leaving: Gathered[] = [];
  const waiting: Gathered[] = [];
  const ends: Gathered[] = [];
  for (const event of events) {
    const flood = floodOfEvent(floods, event);
    const about = grouped(event, flood, from);
    const waitsUntilMs = event.event === 'flood-ended' ? null : reachNow(event, from).waitsUntilMs;
    if (event.event === 'flood-ended') ends.push(about);
    else if (waitsUntilMs === null) leaving.push(about);
    else waiting.push({ ...about, heldUntilMs: Math.max(waitsUntilMs, about.heldUntilMs ?? 0) });
  }
  // Who is told of a rise has no use for the mail of what it rose from.
  for (const rise of leaving.filter(({ severity }) => severity === 'danger')) {
    const told = new Set(reachNow(rise.event, from).addresses);
    for (const early of waiting.filter(
      ({ event }) => event.number !== null && event.number === rise.event.number,
    )) {
      if (takers(early.event, from).some((address) => !told.has(address))) continue;
      waiting.splice(waiting.indexOf(early), 1);
      leaving.push(early);
    }
  }
  // That a flood is over is told with what is left of it, to whom it concerns.
  for (const end of ends) {
    const told = floods.find(({ id }) => floodKey(id) === end.group)?.told === true;
    const waits = waiting.filter(({ group }) => group === end.group);
    if (told || waits.length === 0 || leaving.some(({ group }) => group === end.group)) leaving.push(end);
    else waiting.push({ ...end, heldUntilMs: Math.min(...waits.map(({ heldUntilMs }) => heldUntilMs ?? 0)) });
  }
  return { leaving, waiting };
}

/** What came and went is gathered over all machines, and is no longer urgent. */
export function leavingTogether(from: LeavingFrom, events: readonly UntoldEvent[]): Leaving {
  const all = events.map((event) => {
    const { waitsUntilMs } = reachNow(event, from, true);
    const heldUntilMs = Math.max(
      waitsUntilMs ?? 0,
      overnightMs({ ...event, severity: 'trouble' }, from) ?? 0,
    );
    const { id, wallMs } = event;
    return {
      waits: waitsUntilMs !== null,
      id,
      group: null,
      severity: 'trouble' as const,
      wallMs,
      heldUntilMs,
      event,
    };
  });
  return { leaving: all.filter(({ waits }) => !waits), waiting: all.filter(({ waits }) => waits) };
}

function floodOfEvent(floods: readonly FloodNow[], event: UntoldEvent): FloodNow | null {
  if (event.event === 'flood-ended') return floods.find(({ id }) => floodKey(id) === event.key) ?? null;
  const flood = floodOf(floods, event);
  return flood === null ? null : (floods.find(({ id }) => id === flood.id) ?? null);
}

function grouped(event: UntoldEvent, flood: FloodNow | null, from: LeavingFrom): Gathered {
  const machine = event.machineId === null ? null : String(event.machineId);
  const { id, severity, wallMs } = event;
  const heldUntilMs = overnightMs(event, from);
  if (flood === null) {
    // Reminders of one mail are due at the same time; there is nothing to wait for.
    const gather = event.event === 'reminded' ? { gatherMs: 0 } : {};
    return { id, group: machine, severity, wallMs, heldUntilMs, event, ...gather };
  }
  const gather = flood.endedMs !== null ? { gatherMs: 0 } : flood.told ? { gatherMs: floodRule.againMs } : {};
  return { id, group: floodKey(flood.id), severity, wallMs, heldUntilMs, event, ...gather };
}

function reachNow(event: UntoldEvent, { view, recipients }: LeavingFrom, isOver = false) {
  const machine = event.machineId === null ? null : (machineOfId(view, event.machineId) ?? null);
  return reachOf(recipients, machine, event.severity, isOver);
}

/** Whom it concerns at whatever hour. */
function takers(event: UntoldEvent, { view, recipients }: LeavingFrom): string[] {
  const machine = event.machineId === null ? null : (machineOfId(view, event.machineId) ?? null);
  return recipientsFor(recipients, machine, event.severity);
}

/** The end of the night, for what is held in it; a danger never is. */
export function overnightMs(
  { severity }: Pick<UntoldEvent, 'severity'>,
  { mail, view, nowMs }: Pick<LeavingFrom, 'mail' | 'view' | 'nowMs'>,
): number | null {
  const { holdDuring } = mail;
  const { timeZone } = view.site;
  if (severity === 'danger' || holdDuring == null || !isWithin(holdDuring, nowMs, timeZone)) return null;
  return endOfWithinMs(holdDuring, nowMs, timeZone);
}
