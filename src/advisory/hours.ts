import type { Hours } from '../config/hours.ts';
import { instantsOf, localTime, offsetMs, readingMs } from '../config/local-time.ts';

/**
 * Hours of the week held against an instant. What the clocks of the site show decides: in the hour that autumn repeats
 * hours of that name hold twice, in the one that spring skips not at all.
 */

const minuteMs = 60_000;
const dayMs = 86_400_000;
/** An hour that a spring change skips in one week is there again in the next. */
const daysAhead = 15;

export function isWithin({ days, fromMinute, toMinute }: Hours, ms: number, timeZone: string): boolean {
  const { year, month, day, hour, minute } = localTime(ms, timeZone);
  const weekday = (new Date(Date.UTC(year, month - 1, day)).getUTCDay() + 6) % 7;
  const now = hour * 60 + minute;
  if (fromMinute < toMinute) return days[weekday] === true && now >= fromMinute && now < toMinute;
  const yesterday = (weekday + 6) % 7;
  return (days[weekday] === true && now >= fromMinute) || (days[yesterday] === true && now < toMinute);
}

/** The first instant at or after `ms` that is within. */
export function nextWithinMs(hours: Hours, ms: number, timeZone: string): number {
  if (isWithin(hours, ms, timeZone)) return ms;
  // Within begins where a clock shows the first minute, or where clocks are changed into the hours.
  const opening = openings(hours, ms, timeZone);
  const candidates = [...opening, ...clockChanges(ms, timeZone)].filter((at) => at > ms);
  const next = candidates.sort((a, b) => a - b).find((at) => isWithin(hours, at, timeZone));
  if (next === undefined) throw new Error(`hours ${hours.text} never come in ${timeZone}`);
  return next;
}

/** The first instant at or after `ms` that is not within; null where every minute of the week is. */
export function endOfWithinMs(hours: Hours, ms: number, timeZone: string): number | null {
  const length = (hours.toMinute - hours.fromMinute + 1440) % 1440;
  if (length === 0 && hours.days.every((counts) => counts)) return null;
  const closing = openings({ ...hours, fromMinute: hours.toMinute % 1440 }, ms, timeZone);
  const candidates = [ms, ...closing, ...clockChanges(ms, timeZone)].filter((at) => at >= ms);
  return candidates.sort((a, b) => a - b).find((at) => !isWithin(hours, at, timeZone)) ?? null;
}

/** Instants at which a clock shows the first minute, on any day from yesterday on. */
function openings({ fromMinute }: Hours, ms: number, timeZone: string): number[] {
  const { year, month, day } = localTime(ms, timeZone);
  const today = readingMs({ year, month, day, hour: 0, minute: 0, second: 0 });
  const found: number[] = [];
  for (let ahead = 0; ahead <= daysAhead; ahead++)
    found.push(...instantsOf(today + ahead * dayMs + fromMinute * minuteMs, timeZone));
  return found;
}

/** Instants at which the zone's clocks are changed. */
function clockChanges(ms: number, timeZone: string): number[] {
  const changes: number[] = [];
  const begin = Math.floor(ms / minuteMs) * minuteMs;
  for (let ahead = 0; ahead < daysAhead; ahead++) {
    let before = begin + ahead * dayMs;
    let after = before + dayMs;
    if (offsetMs(before, timeZone) === offsetMs(after, timeZone)) continue;
    while (after - before > minuteMs) {
      const middle = before + Math.floor((after - before) / 2 / minuteMs) * minuteMs;
      if (offsetMs(middle, timeZone) === offsetMs(before, timeZone)) before = middle;
      else after = middle;
    }
    changes.push(after);
  }
  return changes;
}
