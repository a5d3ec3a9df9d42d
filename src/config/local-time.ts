/**
 * Wall-clock readings in an IANA time zone, from the zone data that Node carries. A reading can name no instant
 * (skipped in spring), one, or two (repeated in autumn); `instantsOf` says which.
 */
export interface LocalTime {
  readonly year: number;
  /** 1 to 12. */
  readonly month: number;
  readonly day: number;
  readonly hour: number;
  readonly minute: number;
  readonly second: number;
}

const formats = new Map<string, Intl.DateTimeFormat>();

function formatOf(timeZone: string): Intl.DateTimeFormat {
  let format = formats.get(timeZone);
  if (format === undefined) {
    format = new Intl.DateTimeFormat('en-GB', {
      timeZone,
      calendar: 'gregory',
      numberingSystem: 'latn',
      hourCycle: 'h23',
      year: 'numeric',
      month: '2-digit',
      day: '2-digit',
      hour: '2-digit',
      minute: '2-digit',
      second: '2-digit',
    });
    formats.set(timeZone, format);
  }
  return format;
}

/** What a clock in `timeZone` shows at the instant `ms`. */
export function localTime(ms: number, timeZone: string): LocalTime {
  const part: Record<string, number> = {};
  for (const { type, value } of formatOf(timeZone).formatToParts(ms)) part[type] = Number(value);
  return {
    year: part.year as number,
    month: part.month as number,
    day: part.day as number,
    hour: part.hour as number,
    minute: part.minute as number,
    second: part.second as number,
  };
}

/** The reading as if it were UTC, in milliseconds; for arithmetic on readings of one zone. */
export function readingMs(local: LocalTime): number {
  return Date.UTC(local.year, local.month - 1, local.day, local.hour, local.minute, local.second);
}

/** Milliseconds that the zone's clocks are ahead of UTC at the instant `ms`. */
export function offsetMs(ms: number, timeZone: string): number {
  const whole = Math.floor(ms / 1000) * 1000;
  return readingMs(localTime(whole, timeZone)) - whole;
}

/**
 * Instants at which a clock in `timeZone` shows the reading (`readingMs`), earliest first: none in the gap of a
 * change to summer time, two in the repeated hour.
 */
export function instantsOf(reading: number, timeZone: string): number[] {
  const day = 86_400_000;
  const offsets = new Set([offsetMs(reading - day, timeZone), offsetMs(reading + day, timeZone)]);
  return [...offsets]
    .map((offset) => reading - offset)
    .filter((instant) => instant + offsetMs(instant, timeZone) === reading)
    .sort((a, b) => a - b);
}

/** `2026-03-29`: the local date at the instant `ms`. */
export function localDate(ms: number, timeZone: string): string {
  const { year, month, day } = localTime(ms, timeZone);
  return `${String(year).padStart(4, '0')}-${String(month).padStart(2, '0')}-${String(day).padStart(2, '0')}`;
}

/** Days since 1970-01-01 of the local date at the instant `ms`: neighbouring dates differ by one. */
export function localDay(ms: number, timeZone: string): number {
  return Math.floor((ms + offsetMs(ms, timeZone)) / 86_400_000);
}
