import { instantOfReading, parseIsoStart } from '../acquisition/start-time.ts';
import { localTime } from '../config/local-time.ts';
import { type Parsed, parseDuration, refused, shorten, understood } from '../config/quantity.ts';

/**
 * A moment as people write it on the command line: `2026-03-02`, `2026-03-02T06:30` (a clock of the site), with a zone
 * (`2026-03-02T06:30Z`, `...+01:00`), or how long ago (`7 d`, `36 h`). Of an hour that comes twice, the first.
 */
export function parseWhen(text: string, nowMs: number, siteZone: string): Parsed<number> {
  const written = text.trim();
  const iso = parseIsoStart(/^\d{4}-\d\d-\d\d$/.test(written) ? `${written}T00:00` : written, 'header');
  if (iso !== null) {
    if (iso.zoned) return understood(Math.round(iso.ms));
    return understood(Math.round(instantOfReading(iso.ms, { kind: 'site' }, siteZone, null).ms));
  }
  const ago = /^\d/.test(written) ? parseDuration(written) : null;
  if (ago?.ok) return understood(nowMs - ago.value);
  return refused(
    `'${shorten(text)}' is neither a date or time (2026-03-02, 2026-03-02T06:30) nor a time back (7 d)`,
  );
}

/** A moment to come: a date or time as above, or in how long (`8 h`, `3 d`). */
export function parseUntil(text: string, nowMs: number, siteZone: string): Parsed<number> {
  const written = text.trim();
  const duration = /^\d{4}-/.test(written) ? null : parseDuration(written);
  const until = duration?.ok ? understood(nowMs + duration.value) : parseWhen(written, nowMs, siteZone);
  if (!until.ok)
    return refused(
      `'${shorten(text)}' is neither a date or time (2026-03-02, 2026-03-02T06:30) nor a time from now (3 d)`,
    );
  return until.value > nowMs ? until : refused(`'${shorten(text)}' lies in the past`);
}

/** '2026-03-02 06:30' in the zone, for tables; what `parseWhen` understands but for its space. */
export function timeText(ms: number, timeZone: string): string {
  const { year, month, day, hour, minute } = localTime(ms, timeZone);
  const two = (value: number) => String(value).padStart(2, '0');
  return `${year}-${two(month)}-${two(day)} ${two(hour)}:${two(minute)}`;
}
