import type { Machine, Recipient, Severity } from '../config/site.ts';
import { isWithin, nextWithinMs } from './hours.ts';

/**
 * Whom an event concerns at a moment. An entry of the site file fits by machine, area, severity and hour. Where entries fit
 * but for their hours, an alert or a trouble waits for the first hour that fits; a danger goes to all of them at once.
 */
export interface RecipientNow extends Recipient {
  readonly isOpen: boolean;
  /** When its hours come next. */
  readonly opensMs: () => number;
}

/** The entries at one moment; a decision asks the clock once. */
export function recipientsAt(
  recipients: readonly Recipient[],
  at: { readonly ms: number; readonly timeZone: string },
): RecipientNow[] {
  return recipients.map((one) => {
    const { hours } = one;
    if (hours === undefined || hours === null) return { ...one, isOpen: true, opensMs: () => at.ms };
    let opensMs: number | null = null;
    return {
      ...one,
      isOpen: isWithin(hours, at.ms, at.timeZone),
      opensMs: () => {
        opensMs ??= nextWithinMs(hours, at.ms, at.timeZone);
        return opensMs;
      },
    };
  });
}

/** Entries that take the severity for the machine at some hour. What is site-wide (machine null) concerns all of them. */
function fitting<R extends Recipient>(
  recipients: readonly R[],
  machine: Machine | null,
  severity: Severity,
): R[] {
  return recipients
    .filter(({ machines }) => machine === null || machines === null || machines.includes(machine.id))
    .filter(
      ({ areas }) =>
        machine === null || areas === null || (machine.area !== null && areas.includes(machine.area)),
    )
    .filter(({ severities }) => severities === null || severities.includes(severity));
}

/** Addresses at any hour, each once. */
export function recipientsFor(
  recipients: readonly Recipient[],
  machine: Machine | null,
  severity: Severity,
): string[] {
  return addressesOf(fitting(recipients, machine, severity));
}

/** `waitsUntilMs`: somebody takes it, but not at this hour; null: it goes to `addresses` now, be there none. */
export interface Reach {
  readonly addresses: readonly string[];
  readonly waitsUntilMs: number | null;
}

/** `isOver`: it came and went, so that not even a danger is urgent any more. */
export function reachOf(
  recipients: readonly RecipientNow[],
  machine: Machine | null,
  severity: Severity,
  isOver = false,
): Reach {
  const entries = fitting(recipients, machine, severity);
  const open = entries.filter(({ isOpen }) => isOpen);
  if (open.length > 0) return { addresses: addressesOf(open), waitsUntilMs: null };
  if (entries.length === 0) return { addresses: [], waitsUntilMs: null };
  if (severity === 'danger' && !isOver) return { addresses: addressesOf(entries), waitsUntilMs: null };
  return { addresses: [], waitsUntilMs: Math.min(...entries.map(({ opensMs }) => opensMs())) };
}

function addressesOf(recipients: readonly Recipient[]): string[] {
  return [...new Set(recipients.map(({ address }) => address))];
}
