import { localDate, localTime } from '../config/local-time.ts';
import type { TimeOfDay } from '../config/site.ts';

/**
 * What is due, as a pure function of wall time, zone and what was done last; so a pause, a clock change or a
 * repeated hour neither loses a morning nor doubles it. The ticks only ask.
 */
export interface DailyQuestion {
  readonly wallMs: number;
  readonly timeZone: string;
  readonly at: TimeOfDay;
  /** Local date (`2026-03-29`) of the last one done; null: none yet. */
  readonly lastDone: string | null;
  /** Nothing is due for a time of day that had passed before this. */
  readonly sinceMs: number;
}

/**
 * The local date for which the daily job is due now, or null. After a pause of days only today's is due. A time of
 * day that a clock change skips is due as soon as the clock shows a later one.
 */
export function dailyDue(question: DailyQuestion): string | null {
  const { wallMs, timeZone, at, lastDone, sinceMs } = question;
  const today = localDate(wallMs, timeZone);
  if (lastDone !== null && lastDone >= today) return null;
  if (!reached(wallMs, timeZone, at)) return null;
  const begunToday = localDate(sinceMs, timeZone) === today && reached(sinceMs, timeZone, at);
  return begunToday ? null : today;
}

function reached(ms: number, timeZone: string, at: TimeOfDay): boolean {
  const now = localTime(ms, timeZone);
  return now.hour * 60 + now.minute >= at.hour * 60 + at.minute;
}
