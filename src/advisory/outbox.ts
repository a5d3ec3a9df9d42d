import { createHash } from 'node:crypto';
import type { Severity } from '../config/site.ts';

/**
 * Theory of operation of the outbox.
 *
 *   event committed ──gathered──> message stored ──attempt──> accepted
 *   (due to be told)              one delivery      │  4xx, no connection: waiting, tried again
 *                                 a recipient       │  5xx: failed, told
 *                                                   └─ a newer summary, or the acknowledgement that a
 *                                                      reminder asks for: superseded
 *
 * 1. Nothing is sent that is not stored first, bytes and Message-ID included; so a repeat after a kill between the
 *    server's answer and its storing carries the same Message-ID.
 * 2. A Message-ID is made from what the message is about and to whom it goes, never from a row number or a time.
 * 3. Each recipient's delivery has its own state and moves by one transition at a time; a refusal of one recipient
 *    never touches another's.
 * 4. The pause before the next try is the message's age between a least and a greatest value, so it doubles without
 *    a counter; for danger both are small.
 * 5. Nothing is dropped in silence: 'failed' is journalled and told, 'superseded' names the newer message or says that
 *    the alarm was acknowledged.
 * 6. An event is part of one message: its machine's, that of the flood in whose time it came, or the catch-up. What waits
 *    for somebody's hours or for the morning goes on being gathered; a danger waits for neither.
 */
export interface EventDue {
  readonly id: number;
  /** What it travels with: its machine's events, or the flood's that it is part of; null: the site's own. */
  readonly group: string | null;
  readonly severity: Severity;
  readonly wallMs: number;
  /** Gathering time of its group, where that is not the usual one. */
  readonly gatherMs?: number;
  /** Before this it does not make its group due; it travels with one that leaves. Null: nothing holds it. */
  readonly heldUntilMs?: number | null;
}

export interface GatherTimes {
  readonly gatherMs: number;
  readonly gatherDangerMs: number;
}

/** Events that travel together. */
export interface EventGroup<E extends EventDue> {
  readonly group: string | null;
  readonly severity: Severity;
  readonly events: readonly E[];
}

const rank: Record<Severity, number> = { trouble: 0, alert: 1, danger: 2 };

export function worseSeverity(a: Severity, b: Severity): Severity {
  return rank[a] >= rank[b] ? a : b;
}

export function isWorse(a: Severity, than: Severity): boolean {
  return rank[a] > rank[than];
}

/** When an event makes its group due. A wall clock that was set back does not hold it: one from the future is due. */
function dueMs(event: EventDue, times: GatherTimes, nowMs = Number.POSITIVE_INFINITY): number {
  const gatherMs = event.gatherMs ?? times.gatherMs;
  const waitMs = event.severity === 'danger' ? Math.min(times.gatherDangerMs, gatherMs) : gatherMs;
  return Math.max(event.wallMs > nowMs ? nowMs : event.wallMs + waitMs, event.heldUntilMs ?? 0);
}

/**
 * The groups whose time has come: the oldest event that nothing holds has waited `gatherMs`, or a danger among them
 * `gatherDangerMs`. Most urgent group first, then the one that waits longest.
 */
export function groupsDue<E extends EventDue>(
  events: readonly E[],
  nowMs: number,
  times: GatherTimes,
): EventGroup<E>[] {
  const groups = new Map<string | null, E[]>();
  for (const event of events) {
    const group = groups.get(event.group);
    if (group === undefined) groups.set(event.group, [event]);
    else group.push(event);
  }
  return [...groups]
    .filter(([, all]) => all.some((event) => dueMs(event, times, nowMs) <= nowMs))
    .map(([group, all]) => ({
      group,
      severity: all.map((event) => event.severity).reduce(worseSeverity),
      events: [...all].sort((a, b) => a.id - b.id),
    }))
    .sort(
      (a, b) =>
        rank[b.severity] - rank[a.severity] || (a.events[0]?.wallMs ?? 0) - (b.events[0]?.wallMs ?? 0),
    );
}

/** Wall time at which the next group will be due; null without events. */
export function nextGroupDueMs(events: readonly EventDue[], times: GatherTimes): number | null {
  return events.length === 0 ? null : Math.min(...events.map((event) => dueMs(event, times)));
}

/** Names a message for ever: of the same events, whoever composes it and whenever. */
export function messageIdentity(ledgerId: string, kind: string, about: readonly string[]): string {
  return createHash('sha256')
    .update(JSON.stringify([ledgerId, kind, ...about]))
    .digest('hex');
}

/** `<hash@domain>`, RFC 5322 section 3.6.4. The domain is that of the sender's address. */
export function mailId(identity: string, recipient: string, fromAddress: string): string {
  const hash = createHash('sha256')
    .update(JSON.stringify([identity, recipient.toLowerCase()]))
    .digest('hex');
  const domain = /@([A-Za-z0-9.-]+)>?\s*$/.exec(fromAddress)?.[1] ?? 'humledger.invalid';
  return `<${hash.slice(0, 40)}@${domain}>`;
}

/** What the server made of one attempt. */
export interface AttemptAnswer {
  readonly kind: 'accepted' | 'later' | 'never';
  readonly answer: string;
  /**
   * out: the server takes no mail at all now (no connection, TLS, login; 421), so no other would fare better.
   * gone: it went away in the middle of this mail. Absent: it answered to this mail.
   */
  readonly server?: 'out' | 'gone';
}

export interface Delivery {
  readonly createdMs: number;
  readonly danger: boolean;
  readonly tries: number;
}

export interface DeliveryStep {
  readonly state: 'waiting' | 'accepted' | 'failed';
  readonly tries: number;
  readonly dueMs: number;
  readonly lastAnswer: string;
}

/** The longest pause of all; a mail that waits beyond it waits for a clock that was set back. */
export const greatestPauseMs = 3_600_000;

const pauses = {
  danger: { leastMs: 15_000, greatestMs: 300_000 },
  other: { leastMs: 60_000, greatestMs: greatestPauseMs },
};

/** The state after an attempt; total over every answer. */
export function afterAttempt(delivery: Delivery, answer: AttemptAnswer, nowMs: number): DeliveryStep {
  const tries = delivery.tries + 1;
  const lastAnswer = answer.answer;
  if (answer.kind === 'accepted') return { state: 'accepted', tries, dueMs: nowMs, lastAnswer };
  if (answer.kind === 'never') return { state: 'failed', tries, dueMs: nowMs, lastAnswer };
  return { state: 'waiting', tries, dueMs: nowMs + pauseMs(delivery, nowMs), lastAnswer };
}

/** The message's age, held between a least and a greatest value. */
export function pauseMs(delivery: Pick<Delivery, 'createdMs' | 'danger'>, nowMs: number): number {
  const { leastMs, greatestMs } = delivery.danger ? pauses.danger : pauses.other;
  return Math.min(Math.max(nowMs - delivery.createdMs, leastMs), greatestMs);
}

/** Order in which messages leave: danger, trouble and alert alarms, then the rest. Smaller leaves first. */
export function priorityOf(kind: string, severity: Severity | null): number {
  if (severity === 'danger') return 0;
  if (kind === 'alarm' || kind === 'flood') return 1;
  if (kind === 'catch-up' || kind === 'service') return 2;
  return 3;
}
