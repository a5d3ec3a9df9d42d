import type { StandingFacts } from '../advisory/facts.ts';
import { type AlarmStanding, normalState } from '../detection/alarm.ts';
import { standing } from '../detection/alarm-state.ts';
import { alarmByNumber, type StandingLife } from '../store/alarms.ts';
import { isLedgersOwn } from '../store/ledger-error.ts';
import type { Reader } from '../store/lent-connection.ts';
import { placesOutOfService } from '../store/suppressions.ts';
import { suppressionNow } from './suppression-now.ts';

/** What alarms and troubles share: number, state, since when, who took it in hand, by when somebody should respond. */

/** The state of a life; what has ended is normal, whatever a later life of the same alarm does. */
export function standingOfLife({ alarm, life }: StandingLife): AlarmStanding {
  return life.endedWallMs !== null || alarm.number !== life.number ? 'normal' : standing(alarm.state);
}

/** Its condition stands, or it is latched: it is not over. */
export function stillStands(of: StandingLife): boolean {
  if (standingOfLife(of) === 'normal') return false;
  return of.alarm.state.condition !== 'normal' || of.alarm.state.latched;
}

/** Null also where its record cannot be read: one that is broken must keep no other. */
export async function readableLife(reader: Reader, number: number): Promise<StandingLife | null> {
  try {
    return await alarmByNumber(reader, number);
  } catch (error) {
    if (isLedgersOwn(error)) throw error;
    return null;
  }
}

export async function standingFacts(
  reader: Reader,
  of: StandingLife,
  told: { readonly askedMs: number | null; readonly respondWithinMs: number | null },
): Promise<StandingFacts> {
  const { alarm, life } = of;
  const state = alarm.number === life.number ? alarm.state : normalState;
  const now = standingOfLife(of);
  const held =
    now === 'normal' ? null : await suppressionNow(reader, alarm, await placesOutOfService(reader));
  return {
    number: life.number,
    standing: now,
    sinceMs: state.sinceMs ?? life.raisedUsedMs ?? life.raisedWallMs,
    recordings: state.count,
    respondByMs:
      told.askedMs === null || told.respondWithinMs === null ? null : told.askedMs + told.respondWithinMs,
    acknowledgedBy: life.acknowledgedBy,
    acknowledgedMs: life.acknowledgedWallMs,
    suppressedUntilMs: held?.untilMs ?? null,
    suppressedBy: held?.by ?? null,
    suppressedWhy: held?.while ?? held?.comment ?? null,
    ...(now !== 'normal' && state.heldBack && state.condition === 'danger' && state.told !== 'danger'
      ? { untoldDanger: true }
      : {}),
  };
}
