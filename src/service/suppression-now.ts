import { standing } from '../detection/alarm-state.ts';
import type { StoredAlarm } from '../store/alarms.ts';
import { readJournal } from '../store/journal.ts';
import type { Reader } from '../store/lent-connection.ts';
import { type OutOfService, placeOf } from '../store/suppressions.ts';

/** What holds an alarm back: until when, by whom and why; by design, by which condition of the site file. */
export interface SuppressionNow {
  readonly untilMs: number | null;
  readonly by: string | null;
  readonly comment: string | null;
  readonly while: string | null;
}

/** Of several suppressions the one by which its state is called. Null: nothing holds it back. */
export async function suppressionNow(
  reader: Reader,
  { key, subject, state, shelf }: StoredAlarm,
  places: readonly OutOfService[],
): Promise<SuppressionNow | null> {
  switch (standing(state)) {
    case 'out-of-service': {
      const place = placeOf(places, subject.machineId, subject.pointId);
      const { untilMs = null, by = null, comment = null } = place ?? {};
      return { untilMs, by, comment, while: null };
    }
    case 'shelved': {
      const { untilMs = null, by = null, comment = null } = shelf ?? {};
      return { untilMs, by, comment, while: null };
    }
    case 'suppressed': {
      const rows = await readJournal(reader, { key, limit: 50 });
      const condition = rows.find(({ event }) => event === 'suppressed')?.reason.while;
      const held = typeof condition === 'string' ? condition : null;
      return { untilMs: null, by: null, comment: null, while: held };
    }
    default:
      return null;
  }
}
