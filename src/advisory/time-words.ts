import { localTime } from '../config/local-time.ts';

/** Times and durations as people say them. Month and day names are our own, so that no version of ICU moves a byte. */

export const months = ['Jan', 'Feb', 'Mar', 'Apr', 'May', 'Jun', 'Jul', 'Aug', 'Sep', 'Oct', 'Nov', 'Dec'];
const days = ['Sun', 'Mon', 'Tue', 'Wed', 'Thu', 'Fri', 'Sat'];

const two = (value: number): string => String(value).padStart(2, '0');

/** 'Tue 1 Dec 2026' in the zone. */
export function dateText(ms: number, timeZone: string): string {
  const { year, month, day } = localTime(ms, timeZone);
  return `${days[new Date(Date.UTC(year, month - 1, day)).getUTCDay()]} ${day} ${months[month - 1]} ${year}`;
}

/** '1 Dec' in the zone, where the year stands beside it. */
export function dayText(ms: number, timeZone: string): string {
  const { month, day } = localTime(ms, timeZone);
  return `${day} ${months[month - 1]}`;
}

/** '06:30' in the zone. */
export function clockText(ms: number, timeZone: string): string {
  const { hour, minute } = localTime(ms, timeZone);
  return `${two(hour)}:${two(minute)}`;
}

/** 'Tue 1 Dec 2026, 06:30'. The zone is named once in every message, see `zoneText`. */
export function momentText(ms: number, timeZone: string): string {
  return `${dateText(ms, timeZone)}, ${clockText(ms, timeZone)}`;
}

/** '1 Dec 06:30', for tables; the year stands at the head of the message. */
export function shortMomentText(ms: number, timeZone: string): string {
  const { month, day } = localTime(ms, timeZone);
  return `${day} ${months[month - 1]} ${clockText(ms, timeZone)}`;
}

const spans: readonly [name: string, ms: number][] = [
  ['day', 86_400_000],
  ['hour', 3_600_000],
  ['minute', 60_000],
  ['second', 1000],
];

/** '2 days 3 hours', '45 minutes', '10 seconds': the two largest units, the rest rounded; 'no time' under a second. */
export function durationText(ms: number): string {
  const size = Math.abs(ms);
  const first = spans.findIndex(([, span]) => size >= span);
  if (first === -1) return size >= 500 ? '1 second' : 'no time';
  const step = (spans[Math.min(first + 1, spans.length - 1)] as [string, number])[1];
  let rest = Math.round(size / step) * step;
  const words: string[] = [];
  for (const [name, span] of spans) {
    const count = Math.floor(rest / span);
    rest -= count * span;
    if (count > 0) words.push(`${count} ${name}${count === 1 ? '' : 's'}`);
  }
  return words.join(' ');
}
