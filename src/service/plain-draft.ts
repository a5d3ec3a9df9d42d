import { messageIdentity, priorityOf, worseSeverity } from '../advisory/outbox.ts';
import { type PlainLine, plainNotice } from '../advisory/plain-notice.ts';
import type { UntoldEvent } from '../store/messages.ts';
import { addressesFor } from './catch-up.ts';
import type { Draft, DraftFrom } from './draft.ts';
import { machineOfId } from './fact-names.ts';

/**
 * What leaves when the full text of a message cannot be composed: one message that cannot be written must neither stay
 * untold nor keep the others.
 */

export function stackOf(error: unknown): string {
  return error instanceof Error ? (error.stack ?? String(error)) : String(error);
}

/** Each recipient gets the events that concern him. Stands in no thread. */
export function plainDraft(from: DraftFrom, events: readonly UntoldEvent[], error: unknown): Draft {
  const { view, recipients, ledgerId } = from;
  const byAddress = new Map<string, UntoldEvent[]>();
  for (const event of events) {
    for (const address of addressesFor(view, recipients, event.machineId, [event]))
      byAddress.set(address, [...(byAddress.get(address) ?? []), event]);
  }
  const written = (told: readonly UntoldEvent[]) =>
    plainNotice(
      view.site.name,
      titleOf(told),
      told.map((event) => lineOf(from, event)),
      error,
    );
  const worst = events.map(({ severity }) => severity).reduce(worseSeverity, 'trouble');
  return {
    kind: 'alarm',
    identity: messageIdentity(ledgerId, 'alarm', events.map(({ identity }) => identity).sort()),
    priority: priorityOf('alarm', worst),
    groupKey: 'site',
    subject: written(events).subject,
    tells: events.map(({ id }) => id),
    mails: [...byAddress].map(([recipient, told]) => ({ recipient, mail: written(told), earlier: [] })),
    thread: null,
  };
}

function titleOf(events: readonly UntoldEvent[]): string {
  const worst = events.map(({ severity }) => severity).reduce(worseSeverity, 'trouble');
  const numbers = [...new Set(events.flatMap(({ number }) => number ?? []))];
  const more = numbers.length > 5 ? ` and ${numbers.length - 5} more` : '';
  return `${worst.toUpperCase()} ${numbers.slice(0, 5).join(', ')}${more}`;
}

function lineOf({ view }: DraftFrom, event: UntoldEvent): PlainLine {
  const machine = event.machineId === null ? undefined : machineOfId(view, event.machineId);
  const { number, severity, level } = event;
  const about = [machine?.name, event.key].filter(Boolean).join(', ');
  return { number, severity, about, event: event.event.replaceAll('-', ' '), level };
}
