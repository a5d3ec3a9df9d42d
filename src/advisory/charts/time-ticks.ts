import { instantsOf, localTime, readingMs } from '../../config/local-time.ts';
import { dayText, months } from '../time-words.ts';

/** Ticks of a time axis at round readings of the site's clocks: hours, midnights, first days of months and years. */
export interface TimeTicks {
  /** Instants, ms since 1970 UTC, within the range. */
  readonly atMs: readonly number[];
  readonly text: (ms: number) => string;
}

const hour = 3_600_000;
const day = 24 * hour;
/** Steps that people count in, of hours and of days. */
const hourSteps = [1, 2, 3, 6, 12];
const daySteps = [1, 2, 3, 5, 7, 14];
const monthSteps = [1, 2, 3, 6];

/**
 * At most `most` ticks. A reading that no clock shows (in spring) has no tick, one that comes twice (in autumn) has one.
 */
export function timeTicks(fromMs: number, toMs: number, timeZone: string, most: number): TimeTicks {
  const span = Math.max(1, toMs - fromMs);
  const reading = (ms: number) => readingMs(localTime(Math.floor(ms / 1000) * 1000, timeZone));
  const place = (readings: readonly number[]) =>
    readings
      .flatMap((one) => instantsOf(one, timeZone).slice(0, 1))
      .filter((ms) => ms >= fromMs && ms <= toMs);
  const [first, last] = [reading(fromMs), reading(toMs)];
  const hours = hourSteps.find((step) => span / (step * hour) <= most);
  if (hours !== undefined) {
    return { atMs: place(every(first, last, hours * hour)), text: (ms) => hourText(ms, timeZone) };
  }
  const days = daySteps.find((step) => span / (step * day) <= most);
  if (days !== undefined) {
    return { atMs: place(every(first, last, days * day)), text: (ms) => dayText(ms, timeZone) };
  }
  const step =
    monthSteps.find((count) => span / (count * 30.44 * day) <= most) ??
    12 * Math.ceil(span / (365.25 * day) / most);
  return { atMs: place(firstDays(first, last, step)), text: (ms) => monthText(ms, timeZone, step) };
}

function every(first: number, last: number, step: number): number[] {
  const ticks: number[] = [];
  for (let at = Math.ceil(first / step) * step; at <= last; at += step) ticks.push(at);
  return ticks;
}

function firstDays(first: number, last: number, step: number): number[] {
  const ticks: number[] = [];
  const begin = new Date(first);
  const from = begin.getUTCFullYear() * 12 + begin.getUTCMonth();
  for (let month = Math.floor(from / step) * step; ; month += step) {
    const at = Date.UTC(Math.floor(month / 12), month % 12, 1);
    if (at > last) return ticks;
    if (at >= first) ticks.push(at);
  }
}

function hourText(ms: number, timeZone: string): string {
  const { hour: at, minute } = localTime(ms, timeZone);
  return at === 0 && minute === 0 ? dayText(ms, timeZone) : `${two(at)}:${two(minute)}`;
}

function monthText(ms: number, timeZone: string, step: number): string {
  const { month, year } = localTime(ms, timeZone);
  return step >= 12 || month === 1 ? String(year) : months[month - 1];
}

function two(value: number): string {
  return String(value).padStart(2, '0');
}
