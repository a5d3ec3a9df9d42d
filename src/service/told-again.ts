import type { ReminderFacts, WasAcknowledged } from '../advisory/reminder-facts.ts';
import { readJournal } from '../store/journal.ts';
import type { Reader } from '../store/lent-connection.ts';
import type { UntoldEvent } from '../store/messages.ts';

/** Why an event tells of something again, as its entry in the journal says; nothing for all other events. */
export async function toldAgain(
  reader: Reader,
  { event, journalSequence }: Pick<UntoldEvent, 'event' | 'journalSequence'>,
): Promise<{ readonly reminder?: ReminderFacts; readonly wasAcknowledged?: WasAcknowledged }> {
  if (event !== 'reminded' && event !== 'still-stands') return {};
  const [row] = await readJournal(reader, { afterSequence: journalSequence - 1, limit: 1 });
  const { reminder, toldMs, thenTo, acknowledgedBy, acknowledgedMs } = row?.reason ?? {};
  if (event === 'reminded' && typeof reminder === 'number' && typeof toldMs === 'number')
    return {
      reminder: { number: reminder, toldMs, thenTo: Array.isArray(thenTo) ? thenTo.map(String) : [] },
    };
  if (event === 'still-stands' && typeof acknowledgedBy === 'string' && typeof acknowledgedMs === 'number')
    return { wasAcknowledged: { by: acknowledgedBy, ms: acknowledgedMs } };
  return {};
}
