import type { LimitFacts } from '../advisory/facts.ts';
import type { LimitReasons } from '../config/site.ts';
import type { Thresholds } from '../detection/thresholds.ts';
import { readJournal } from '../store/journal.ts';
import type { Reader } from '../store/lent-connection.ts';
import { missingText } from './limits-in-force.ts';

/** A limit as it stood when it was decided by: the journal keeps its values and their reasons with each decision. */

/** Null where the row is none of a decision. */
export function limitOfRow(reason: Readonly<Record<string, unknown>>, id: string): LimitFacts | null {
  if (!('alert' in reason) && !('danger' in reason)) return null;
  const { why, provisional, confirmedBy, level, missing } = reason;
  return {
    id,
    side: reason.side === 'lower' ? 'lower' : 'upper',
    alert: numberOrNull(reason.alert),
    danger: numberOrNull(reason.danger),
    ...(why == null ? {} : { reasons: why as LimitReasons }),
    ...(reason.kind === 'rate' && typeof level === 'number' ? { compared: level } : {}),
    ...(provisional === true ? { provisional } : {}),
    ...(typeof confirmedBy === 'string' ? { confirmedBy } : {}),
    ...(missing == null ? {} : { unknown: missingText(missing as NonNullable<Thresholds['missing']>) }),
  };
}

/** By the newest decision of an alarm with this number; null where the journal has none. */
export async function limitOfLife(
  reader: Reader,
  number: number | null,
  id: string,
): Promise<LimitFacts | null> {
  const rows = number === null ? [] : await readJournal(reader, { number, limit: 100 });
  for (const { reason } of rows) {
    const limit = limitOfRow(reason, id);
    if (limit !== null) return limit;
  }
  return null;
}

function numberOrNull(value: unknown): number | null {
  return typeof value === 'number' ? value : null;
}
