/**
 * Reminders of what was told and nobody has acknowledged. The first comes `afterMs` after a server took the mail, each
 * further one after twice the pause before, at most a day (or `afterMs`, where that is longer), counted from when a server
 * took the reminder before. After so many reminders, or so long, the next recipients are told as well, one after the
 * other. They end after `fewestInAll`, or when each of the next recipients has had one; the summary goes on naming the alarm.
 * An acknowledgement ends them at once.
 */
export interface ReminderRule {
  readonly afterMs: number;
  /** Addresses that join, in their order. */
  readonly thenTo: readonly string[];
  /** The first joins with the reminder after so many, each further one with the next; or one each time this time is over. */
  readonly thenAfter: ThenAfter;
}

export type ThenAfter = { readonly reminders: number } | { readonly ms: number };

/** What was told of an alarm since it was last told anew; wall times at which a server took it. */
export interface ToldSoFar {
  readonly firstMs: number;
  /** Of the newest mail, the first or a reminder. */
  readonly lastMs: number;
  readonly reminders: number;
}

export interface ReminderDue {
  /** Counts from 1. */
  readonly number: number;
  /** Those of the next recipients that have joined. */
  readonly thenTo: readonly string[];
}

const longestPauseMs = 86_400_000;
const fewestInAll = 6;

/** Usual pause of a danger before its first reminder; alerts and troubles have none. */
export const dangerRemindAfterMs = 3_600_000;

export function mostReminders({ thenTo, thenAfter }: ReminderRule): number {
  return Math.max(
    fewestInAll,
    'reminders' in thenAfter ? thenAfter.reminders + thenTo.length : fewestInAll + thenTo.length,
  );
}

/** Pause before the reminder of that number. */
export function reminderPauseMs({ afterMs }: ReminderRule, number: number): number {
  return Math.min(afterMs * 2 ** Math.min(number - 1, 30), Math.max(afterMs, longestPauseMs));
}

/** When the next reminder is due; null: there is none any more. */
export function nextReminderMs(rule: ReminderRule, told: ToldSoFar): number | null {
  const number = told.reminders + 1;
  if (number > mostReminders(rule)) return null;
  const usual = told.lastMs + reminderPauseMs(rule, number);
  if (!('ms' in rule.thenAfter)) return usual;
  // The next recipient does not wait for a pause that has grown long.
  const joined = joinedBy(rule, told, told.lastMs);
  if (joined >= rule.thenTo.length) return usual;
  return Math.min(usual, told.firstMs + (joined + 1) * rule.thenAfter.ms);
}

export function reminderDue(rule: ReminderRule, told: ToldSoFar, nowMs: number): ReminderDue | null {
  const dueMs = nextReminderMs(rule, told);
  if (dueMs === null || nowMs < dueMs) return null;
  const count = joinedBy(rule, { ...told, reminders: told.reminders + 1 }, nowMs);
  return { number: told.reminders + 1, thenTo: rule.thenTo.slice(0, count) };
}

/** How many of the next recipients have joined with the reminder of that number, at that time. */
function joinedBy({ thenTo, thenAfter }: ReminderRule, told: ToldSoFar, atMs: number): number {
  const steps =
    'reminders' in thenAfter
      ? told.reminders - thenAfter.reminders
      : Math.floor((atMs - told.firstMs) / thenAfter.ms);
  return Math.min(thenTo.length, Math.max(0, steps));
}
