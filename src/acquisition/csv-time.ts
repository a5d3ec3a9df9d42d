/** A date-time as written: whole seconds since 1970 (of UTC if `zoned`, else as if its clock were UTC), and the rest. */
export interface Instant {
  seconds: number;
  fraction: number;
  fractionDigits: number;
  zoned: boolean;
}

const yearFirst = /^(\d{4})([-/.])(\d{1,2})\2(\d{1,2})[T ]+/i;
const dayFirst = /^(\d{1,2})\.(\d{1,2})\.(\d{4})[T ]+/i;
const clockTime = /^(\d{1,2}):(\d\d)(?::(\d\d)(?:[.,](\d{1,12}))?)?\s*(Z|UTC|[+-]\d\d(?::?\d\d)?)?$/i;

/**
 * Reads a date-time: ISO 8601 (yyyy-mm-dd, 'T' or a blank, hh:mm, :ss, fraction, 'Z' or an offset), also with
 * slashes or dots, and dd.mm.yyyy. A date with slashes that begins with day or month has two meanings and is not
 * read. False where there is no such instant.
 */
export function readInstant(text: string, into: Instant): boolean {
  const trimmed = text.trim();
  const iso = yearFirst.exec(trimmed);
  const dotted = iso === null ? dayFirst.exec(trimmed) : null;
  const date = iso ?? dotted;
  if (date === null) return false;
  const [year, month, day] = iso
    ? [iso[1], iso[3], iso[4]].map(Number)
    : [date[3], date[2], date[1]].map(Number);
  const clock = clockTime.exec(trimmed.slice(date[0].length));
  if (clock === null) return false;
  const [hour, minute, second] = [clock[1], clock[2], clock[3] ?? '0'].map(Number);
  const dayMs = Date.UTC(year, month - 1, day);
  const possible = month >= 1 && month <= 12 && new Date(dayMs).getUTCDate() === day && year >= 1970;
  if (!possible || hour > 23 || minute > 59 || second > 60) return false;
  const offset = zoneOffsetS(clock[5]);
  if (offset === null) return false;
  into.seconds = dayMs / 1000 + hour * 3600 + minute * 60 + second - offset;
  into.fractionDigits = clock[4]?.length ?? 0;
  into.fraction = clock[4] === undefined ? 0 : Number(`0.${clock[4]}`);
  into.zoned = clock[5] !== undefined;
  return true;
}

/** Columns of the fields in yyyy-mm-ddThh:mm:ss and what separates them ('T' or a blank at 10). */
const separators: readonly (readonly [number, number])[] = [
  [4, 0x2d],
  [7, 0x2d],
  [13, 0x3a],
  [16, 0x3a],
];
const plainLength = 19;

/**
 * The common form, yyyy-mm-ddThh:mm:ss with fraction and 'Z' or neither, read from the bytes: a time column repeats
 * it on each of a million lines. False for any other form, which is not to say that it is no instant.
 */
export function readPlainInstant(bytes: Uint8Array, from: number, to: number, into: Instant): boolean {
  if (to - from < plainLength) return false;
  for (const [at, byte] of separators) if (bytes[from + at] !== byte) return false;
  if (bytes[from + 10] !== 0x54 && bytes[from + 10] !== 0x20) return false;
  const zoned = bytes[to - 1] === 0x5a;
  const end = zoned ? to - 1 : to;
  const fractionAt = from + plainLength + 1;
  const fractionDigits = Math.max(0, end - fractionAt);
  if (end > from + plainLength) {
    const mark = bytes[from + plainLength];
    if ((mark !== 0x2e && mark !== 0x2c) || fractionDigits < 1 || fractionDigits > 12) return false;
  }
  const year = wholeAt(bytes, from, 4);
  const month = wholeAt(bytes, from + 5, 2);
  const day = wholeAt(bytes, from + 8, 2);
  const hour = wholeAt(bytes, from + 11, 2);
  const minute = wholeAt(bytes, from + 14, 2);
  const second = wholeAt(bytes, from + 17, 2);
  const fraction = wholeAt(bytes, fractionAt, fractionDigits);
  const dayMs = Date.UTC(year, month - 1, day);
  const inMonth = year >= 1970 && month >= 1 && month <= 12 && day >= 1 && dayMs < Date.UTC(year, month, 1);
  if (!inMonth || !(hour < 24 && minute < 60 && second < 60) || Number.isNaN(fraction)) return false;
  into.seconds = dayMs / 1000 + hour * 3600 + minute * 60 + second;
  into.fraction = fraction / 10 ** fractionDigits;
  into.fractionDigits = fractionDigits;
  into.zoned = zoned;
  return true;
}

/** NaN where another byte than a digit stands. */
function wholeAt(bytes: Uint8Array, from: number, count: number): number {
  let value = 0;
  for (let at = from; at < from + count; at++) {
    const digit = bytes[at] - 0x30;
    if (digit < 0 || digit > 9) return Number.NaN;
    value = value * 10 + digit;
  }
  return value;
}

function zoneOffsetS(zone: string | undefined): number | null {
  if (zone === undefined || /^[zu]/i.test(zone)) return 0;
  const hours = Number(zone.slice(1, 3));
  const minutes = zone.length > 3 ? Number(zone.slice(-2)) : 0;
  if (hours > 14 || minutes > 59) return null;
  return (zone.startsWith('-') ? -1 : 1) * (hours * 3600 + minutes * 60);
}

/** A column's heading without its unit, if that is how a time column is called. */
const timeNames =
  /^(t|time|times|time ?stamp|elapsed time|relative time|sample time|date ?[/&-]? ?time|date and time|date|zeit|zeitstempel|uhrzeit|datum|datum ?[/&-]? ?(uhr)?zeit|messzeit|seconds?|sekunden?|milliseconds?|millisekunden?)$/i;

const secondsOf: Readonly<Record<string, number>> = {
  s: 1,
  sec: 1,
  secs: 1,
  second: 1,
  seconds: 1,
  sek: 1,
  sekunde: 1,
  sekunden: 1,
  ms: 1e-3,
  msec: 1e-3,
  millisecond: 1e-3,
  milliseconds: 1e-3,
  millisekunde: 1e-3,
  millisekunden: 1e-3,
  us: 1e-6,
  µs: 1e-6,
  μs: 1e-6,
  min: 60,
  minutes: 60,
  h: 3600,
  hours: 3600,
};

/** Seconds of one unit of a time column ('s', 'ms', ...), undefined for any other text. */
export function secondsOfUnit(unit: string): number | undefined {
  const bare = unit
    .trim()
    .replace(/^[[(]\s*|\s*[\])]$/g, '')
    .toLowerCase();
  return Object.hasOwn(secondsOf, bare) ? secondsOf[bare] : undefined;
}

/** What a heading says of a time column: seconds of its unit, null where it names none; the unit as written. */
export interface TimeHeading {
  readonly unitS: number | null;
  readonly unitText: string | null;
}

/**
 * Reads the heading of a time column: 'Time (s)', 't/ms', 'time_s', 'Zeit [s]', 'Milliseconds', 'date/time'. Null for
 * the heading of a channel.
 */
export function timeHeadingOf(heading: string): TimeHeading | null {
  const trimmed = heading.trim();
  const parts = /^(.*?)\s*(?:[[(]\s*([^\])]+?)\s*[\])]|[\s_,/]\s*(\S+))$/.exec(trimmed);
  if (parts !== null && timeNames.test(parts[1])) {
    const unitText = parts[2] ?? parts[3];
    const unitS = secondsOfUnit(unitText) ?? null;
    if (unitS !== null || parts[2] !== undefined) return { unitS, unitText };
  }
  if (!timeNames.test(trimmed)) return null;
  const unitS = secondsOfUnit(trimmed);
  return unitS === undefined ? { unitS: null, unitText: null } : { unitS, unitText: trimmed };
}
