import { type Parsed, parseDuration, refused, shorten, understood } from './quantity.ts';

const mostReminders = 10;
const leastMs = 5 * 60_000;
const mostMs = 30 * 86_400_000;

/** '2 reminders', or a time such as '8 h'. */
export function parseThenAfter(
  text: string,
): Parsed<{ readonly reminders: number } | { readonly ms: number }> {
  const counted = /^(\d+)\s*reminders?$/i.exec(text.trim());
  const what = `'${shorten(text)}' is neither 1 to ${mostReminders} reminders nor a time from 5 min to 30 d`;
  if (counted !== null) {
    const reminders = Number(counted[1]);
    return reminders >= 1 && reminders <= mostReminders ? understood({ reminders }) : refused(what);
  }
  if (/^\d+$/.test(text.trim())) return refused(what, `${text.trim()} reminders`);
  const time = parseDuration(text, 'h');
  if (!time.ok) return time;
  return time.value >= leastMs && time.value <= mostMs ? understood({ ms: time.value }) : refused(what);
}
