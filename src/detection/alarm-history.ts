import type { AlarmState, JournalEventName } from './alarm.ts';
import type { Because } from './suppression.ts';

/**
 * Alarms that do people no service: they come and go (chattering), or stand for weeks (ANSI/ISA-18.2-2016: none of the
 * first, few of the second, an action plan for each). The standard's first criterion for chattering, three times in a
 * minute, means nothing between recordings of an hour; here it is three returns within 24 recordings of the point.
 *
 * A chattering alert is told once as that, with what the site file could do about it, and is then held back by design
 * each time it comes, until it has stopped coming and going. Where it stands by then, it is told. A danger is told each
 * time. Troubles and lower levels of urgency are not held back by this, only named.
 */
export const chatteringReturns = 3;
export const chatteringRecordings = 24;
export const longStandingMs = 14 * 86_400_000;

export interface Chatter {
  /** Returns within the last `chatteringRecordings`. */
  readonly returns: number;
  /** The last time it was raised it was told as chattering, or held back as that. */
  readonly told: boolean;
}

export interface PastEvent {
  readonly event: JournalEventName;
  readonly usedMs: number | null;
  readonly reason: Readonly<Record<string, unknown>>;
}

/**
 * @param newestFirst the alarm's journal
 * @param fromMs used time of the oldest of the recordings that count
 * @returns null where it does not chatter
 */
export function chatterOf(newestFirst: readonly PastEvent[], fromMs: number): Chatter | null {
  const returns = newestFirst.filter(
    ({ event, usedMs }) => event === 'returned' && usedMs !== null && usedMs >= fromMs,
  ).length;
  if (returns < chatteringReturns) return null;
  const raised = newestFirst.find(({ event }) => event === 'raised');
  return { returns, told: raised?.reason.chattering != null };
}

/** As the journal and the mail have it, beside the event 'raised'. */
export function chatterReason({ returns }: Chatter): Readonly<Record<string, unknown>> {
  return { chattering: { returns, recordings: chatteringRecordings } };
}

/** Why a chattering alarm is held back; null: it is not. What stands and was told is left as it is. */
export function heldAsChattering(
  chatter: Chatter | null,
  state: Pick<AlarmState, 'condition' | 'suppressions'>,
): Because | null {
  if (chatter?.told !== true || state.condition === 'danger') return null;
  if (state.condition !== 'normal' && !state.suppressions.includes('by-design')) return null;
  return {
    comment: null,
    reason: {
      while: `it comes and goes: ${chatter.returns} returns within ${chatteringRecordings} recordings`,
    },
  };
}

/** Stands for more than two weeks, whatever holds it back. */
export function isLongStanding(state: Pick<AlarmState, 'condition' | 'sinceMs'>, nowMs: number): boolean {
  return state.condition !== 'normal' && state.sinceMs !== null && nowMs - state.sinceMs > longStandingMs;
}
