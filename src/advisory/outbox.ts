import { createHash } from 'node:crypto';
import type { Machine, Recipient, Severity } from '../config/site.ts';

/**
 * Theory of operation of the outbox.
 *
 *   event committed ──gathered──> message stored ──attempt──> accepted
 *   (due to be told)              one delivery      │  4xx, no connection: waiting, tried again
 *                                 a recipient       │  5xx: failed, told
 *                                                   └─ a newer summary: superseded
 *
 * 1. Nothing is sent that is not stored first, bytes and Message-ID included; so a repeat after a kill between the
 *    server's answer and its storing carries the same Message-ID.
 * 2. A Message-ID is made from what the message is about and to whom it goes, never from a row number or a time.
 * 3. Each recipient's delivery has its own state and moves by one transition at a time; a refusal of one recipient
 *    never touches another's.
 * 4. The pause before the next try is the message's age between a least and a greatest value, so it doubles without
 *    a counter; for danger both are small.
 * 5. Nothing is dropped in silence: 'failed' is journalled and told, 'superseded' names the newer message.
 */
export interface EventDue {
  readonly id: number;
  readonly machineId: string | null;
  readonly severity: Severity;
  readonly wallMs: number;
}

export interface GatherTimes {
  readonly gatherMs: number;
  readonly gatherDangerMs: number;
}

/** Events that travel together: one machine's (or the site's own). */
export interface EventGroup<E extends EventDue> {
  readonly machineId: string | null;
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

/**
 * The groups whose time has come: the oldest event has waited `gatherMs`, or a danger among them `gatherDangerMs`.
 * A wall clock that was set back does not hold an event: one from the future counts as due.
 * Most urgent group first, then the one that waits longest.
 */
export function groupsDue<E extends EventDue>(
  events: readonly E[],
  nowMs: number,
  times: GatherTimes,
): EventGroup<E>[] {
  const byMachine = new Map<string | null, E[]>();
  for (const event of events) {
    const group = byMachine.get(event.machineId);
    if (group === undefined) byMachine.set(event.machineId, [event]);
    else group.push(event);
  }
  const waited = (event: E, least: number) => event.wallMs > nowMs || nowMs - event.wallMs >= least;
  return [...byMachine]
    .filter(([, group]) =>
      group.some((event) =>
        waited(
          event,
          event.severity === 'danger' ? Math.min(times.gatherDangerMs, times.gatherMs) : times.gatherMs,
        ),
      ),
    )
    .map(([machineId, group]) => ({
      machineId,
      severity: group.map((event) => event.severity).reduce(worseSeverity),
      events: [...group].sort((a, b) => a.id - b.id),
    }))
    .sort(
      (a, b) =>
        rank[b.severity] - rank[a.severity] || (a.events[0]?.wallMs ?? 0) - (b.events[0]?.wallMs ?? 0),
    );
}

/** Wall time at which the next group will be due; null without events. */
export function nextGroupDueMs(events: readonly EventDue[], times: GatherTimes): number | null {
  const waits = events.map(
    (event) =>
      event.wallMs +
      Math.min(times.gatherMs, event.severity === 'danger' ? times.gatherDangerMs : times.gatherMs),
  );
  return waits.length === 0 ? null : Math.min(...waits);
}

/** Whom a group of events concerns. Site-wide events (machine null) go to everyone who takes their severity. */
export function recipientsFor(
  recipients: readonly Recipient[],
  machine: Machine | null,
  severity: Severity,
): string[] {
  const addresses = recipients
    .filter(({ machines }) => machine === null || machines === null || machines.includes(machine.id))
    .filter(
      ({ areas }) =>
        machine === null || areas === null || (machine.area !== null && areas.includes(machine.area)),
    )
    .filter(({ severities }) => severities === null || severities.includes(severity))
    .map(({ address }) => address);
  return [...new Set(addresses)];
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
  if (kind === 'alarm') return 1;
  if (kind === 'catch-up' || kind === 'service') return 2;
  return 3;
}
