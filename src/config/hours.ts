import { nearest } from './nearest.ts';
import { type Parsed, refused, shorten, understood } from './quantity.ts';

/**
 * Hours of the week, as a clock of the site shows them: `06:00..22:00`, `mon..fri 06:00..18:00`, `sat..sun`. The first
 * minute belongs to them, the last does not. Where the end is not after the beginning they go on past midnight, and
 * the day is the one on which they begin.
 */
export interface Hours {
  /** Monday first. */
  readonly days: readonly boolean[];
  /** Minute of the day, 0 to 1439. */
  readonly fromMinute: number;
  /** 1 to 1440 (24:00). */
  readonly toMinute: number;
  /** As written. */
  readonly text: string;
}

export const minutesADay = 1440;
export const weekdays = ['mon', 'tue', 'wed', 'thu', 'fri', 'sat', 'sun'] as const;
const longNames = ['monday', 'tuesday', 'wednesday', 'thursday', 'friday', 'saturday', 'sunday'];

const exactForm = /^(?:([a-z]{3})(?:\.\.([a-z]{3}))?)?(?: +|^|$)(?:(\d{2}:\d{2})\.\.(\d{2}:\d{2}))?$/;
const looseForm =
  /^(?:([a-z]+)\.?(?:\s*(?:\.{2,3}|-|–|to)\s*([a-z]+)\.?)?)?\s*,?\s*(?:(\d{1,2})(?:[:.h]?(\d{2}))?\s*(am|pm)?\s*(?:\.{2,3}|-|–|to)\s*(\d{1,2})(?:[:.h]?(\d{2}))?\s*(am|pm)?)?$/i;

export function parseHours(text: string): Parsed<Hours> {
  const written = text.trim();
  const exact = exactForm.exec(written);
  const what = `'${shorten(text)}' is no hours such as 06:00..22:00 or mon..fri 06:00..18:00`;
  if (written === '' || exact === null) return refused(what, meantBy(written));
  const [, first, last, from, to] = exact;
  const unknown = [first, last].find((day) => day !== undefined && indexOf(day) === -1);
  if (unknown !== undefined) {
    const day = nearest(unknown, weekdays);
    return refused(
      `'${unknown}' is no day (${weekdays.join(', ')})`,
      day === null ? null : written.replace(unknown, day),
    );
  }
  const fromMinute = from === undefined ? 0 : minuteOf(from);
  const toMinute = to === undefined ? minutesADay : minuteOf(to);
  if (fromMinute === null || fromMinute === minutesADay || toMinute === null) return refused(what);
  if (fromMinute === toMinute)
    return refused(
      `'${shorten(text)}' begins when it ends`,
      first === undefined ? null : written.split(/ +/)[0],
    );
  const days = daysOf(first, last);
  // 22:00..00:00 ends with its day.
  return understood({
    days,
    fromMinute,
    toMinute: toMinute === 0 ? minutesADay : toMinute,
    text: written.replace(/ +/, ' '),
  });
}

function indexOf(day: string): number {
  return (weekdays as readonly string[]).indexOf(day);
}

function daysOf(first: string | undefined, last: string | undefined): boolean[] {
  if (first === undefined) return weekdays.map(() => true);
  const from = indexOf(first);
  const length = last === undefined ? 0 : (indexOf(last) - from + 7) % 7;
  return weekdays.map((_, day) => (day - from + 7) % 7 <= length);
}

function minuteOf(time: string): number | null {
  const [hour, minute] = time.split(':').map(Number) as [number, number];
  if (hour === 24 && minute === 0) return minutesADay;
  return hour < 24 && minute < 60 ? hour * 60 + minute : null;
}

/** What was probably meant, in the right form: 'Mon-Fri 6-18' is 'mon..fri 06:00..18:00'. */
function meantBy(written: string): string | null {
  const loose = looseForm.exec(written);
  if (loose === null || written === '') return null;
  const [, first, last, fromHour, fromMinute, fromHalf, toHour, toMinute, toHalf] = loose;
  const words: string[] = [];
  const days = [first, last].filter((day) => day !== undefined).map(dayMeant);
  if (days.includes(null)) return null;
  if (days.length > 0) words.push(days.join('..'));
  if (fromHour !== undefined && toHour !== undefined) {
    const from = timeMeant(fromHour, fromMinute, fromHalf);
    const to = timeMeant(toHour, toMinute, toHalf);
    if (from === null || to === null || from === '24:00') return null;
    words.push(`${from}..${to}`);
  }
  const meant = words.join(' ');
  return meant !== written && parseHours(meant).ok ? meant : null;
}

function dayMeant(word: string): string | null {
  const lower = word.toLowerCase();
  const index = longNames.findIndex((name) => lower.length >= 2 && name.startsWith(lower));
  return index === -1 ? null : (weekdays[index] ?? null);
}

function timeMeant(hour: string, minute: string | undefined, half: string | undefined): string | null {
  const written = Number(hour);
  const afternoon = half?.toLowerCase() === 'pm' && written < 12;
  const hours = afternoon ? written + 12 : half?.toLowerCase() === 'am' && written === 12 ? 0 : written;
  const time = `${String(hours).padStart(2, '0')}:${minute ?? '00'}`;
  return minuteOf(time) === null ? null : time;
}

/** Minutes of a week, Monday 00:00 first, that belong to the hours; of a week without a change of clocks. */
export function minutesOfWeek({ days, fromMinute, toMinute }: Hours): Uint8Array {
  const week = new Uint8Array(7 * minutesADay);
  const length = (toMinute - fromMinute + minutesADay) % minutesADay || minutesADay;
  days.forEach((counts, day) => {
    if (!counts) return;
    const begin = day * minutesADay + fromMinute;
    for (let minute = begin; minute < begin + length; minute++) week[minute % week.length] = 1;
  });
  return week;
}

/** 'sat 00:00 to mon 06:00': stretches of the week in which `covered` is 0; none where all or nothing is covered. */
export function gapsOfWeek(covered: Uint8Array): string[] {
  const begins: number[] = [];
  const at = (minute: number) => covered[(minute + covered.length) % covered.length];
  for (let minute = 0; minute < covered.length; minute++)
    if (at(minute) === 0 && at(minute - 1) === 1) begins.push(minute);
  return begins.map((begin) => {
    let end = begin;
    while (at(end) === 0) end++;
    return `${minuteText(begin)} to ${minuteText(end % covered.length)}`;
  });
}

function minuteText(minute: number): string {
  const two = (value: number) => String(value).padStart(2, '0');
  const ofDay = minute % minutesADay;
  return `${weekdays[Math.floor(minute / minutesADay)]} ${two(Math.floor(ofDay / 60))}:${two(ofDay % 60)}`;
}
