import { nearest } from './nearest.ts';
import { type Parsed, refused, shorten, understood } from './quantity.ts';
import type { RecordingSettings, TimeOfDay } from './site.ts';

/** An IANA time zone name that this Node knows; offsets are refused, since a site changes its clocks. */
export function parseTimeZone(text: string): Parsed<string> {
  const name = text.trim();
  if (/^[A-Za-z][A-Za-z0-9_+/-]*$/.test(name)) {
    try {
      // The only way to ask for the aliases too (supportedValuesOf lists one name a zone).
      new Intl.DateTimeFormat('en', { timeZone: name });
      return understood(name);
    } catch {
      // Unknown: the nearest known name follows.
    }
  }
  const known = ['UTC', ...Intl.supportedValuesOf('timeZone')];
  const byCity = known.find(
    (zone) => zone.split('/').at(-1)?.toLowerCase() === name.toLowerCase().replace(/\s/g, '_'),
  );
  const what = `'${shorten(text)}' is no known time zone (a name such as Europe/Dublin)`;
  return refused(what, byCity ?? nearest(name, known));
}

/** '06:30'. '0630', '6.30' and '6:30 am' are refused with the time they mean. */
export function parseTimeOfDay(text: string): Parsed<TimeOfDay> {
  const exact = /^(\d{1,2}):(\d{2})$/.exec(text.trim());
  if (exact !== null && Number(exact[1]) < 24 && Number(exact[2]) < 60) {
    return understood({ hour: Number(exact[1]), minute: Number(exact[2]) });
  }
  const meant = /^(\d{1,2})[:.h ]?(\d{2})(?::\d{2})?\s*(am|pm)?$/i.exec(text.trim());
  const what = `'${shorten(text)}' is no time of day`;
  if (meant === null) return refused(what);
  let hour = Number(meant[1]);
  if (meant[3]?.toLowerCase() === 'pm' && hour < 12) hour += 12;
  if (meant[3]?.toLowerCase() === 'am' && hour === 12) hour = 0;
  if (hour > 23 || Number(meant[2]) > 59) return refused(what);
  return refused(what, `${String(hour).padStart(2, '0')}:${meant[2]}`);
}

/** `UTC`, `site`, or an offset such as `+01:00`. */
export function parseClock(text: string): Parsed<RecordingSettings['clock']> {
  const word = text.trim();
  if (word === 'UTC') return understood({ kind: 'utc' });
  if (word === 'site') return understood({ kind: 'site' });
  const offset = /^([+-])(\d{2}):(\d{2})$/.exec(word);
  if (offset !== null && Number(offset[2]) <= 14 && Number(offset[3]) < 60) {
    const minutes = Number(offset[2]) * 60 + Number(offset[3]);
    return understood({ kind: 'offset', minutes: offset[1] === '-' ? -minutes : minutes });
  }
  const loose = /^(?:UTC|GMT)?\s*([+-])(\d{1,2})(?::?(\d{2}))?$/i.exec(word);
  const what = `'${shorten(text)}' is none of UTC, site, +01:00`;
  if (/^(utc|gmt|z)$/i.test(word)) return refused(what, 'UTC');
  if (loose !== null) return refused(what, `${loose[1]}${loose[2].padStart(2, '0')}:${loose[3] ?? '00'}`);
  return refused(what, nearest(word, ['UTC', 'site']));
}
