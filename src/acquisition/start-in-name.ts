import { RE2JS } from 're2js';
import type { StatedStart } from './recording.ts';

/**
 * The start that a file's name states, by a pattern such as `<year><month><day>T<hour><minute><second>Z`. The
 * pattern's other letters are taken as they stand (a Z too: what the logger's clock shows is said by `clock`).
 */
export interface NamePattern {
  readonly regex: RE2JS;
  /** Fields in the order of the pattern. */
  readonly fields: readonly Field[];
  /** With a / the pattern is looked for in the whole path, without one in the name. */
  readonly wholePath: boolean;
}

type Field = 'year' | 'month' | 'day' | 'hour' | 'minute' | 'second';

const digitsOf: Readonly<Record<Field, number>> = {
  year: 4,
  month: 2,
  day: 2,
  hour: 2,
  minute: 2,
  second: 2,
};
/** A bound on the places that are tried in one name. */
const mostCandidates = 300;

/** Reads a pattern that the site file's check has accepted; throws on any other. Seconds may be missing. */
export function namePattern(pattern: string): NamePattern {
  const fields: Field[] = [];
  let regex = '';
  for (const piece of pattern.split(/(<[^<>]*>)/)) {
    const name = piece.slice(1, -1);
    if (!piece.startsWith('<')) regex += RE2JS.quote(piece);
    else if (name === 'any') regex += '[^/]*?';
    else if (isField(name) && !fields.includes(name)) {
      fields.push(name);
      regex += `([0-9]{${digitsOf[name]}})`;
    } else throw new Error(`start_in_name: ${piece} was not refused`);
  }
  return { regex: RE2JS.compile(regex), fields, wholePath: pattern.includes('/') };
}

function isField(name: string): name is Field {
  return Object.hasOwn(digitsOf, name);
}

/**
 * The first place in the name where the pattern gives a date that exists; places that cut a longer row of digits in
 * two come last. Null where there is none. The answer is a wall-clock reading without zone.
 */
export function startInName(pattern: NamePattern, path: string): StatedStart | null {
  const text = pattern.wholePath ? path : path.slice(path.lastIndexOf('/') + 1);
  const matcher = pattern.regex.matcher(text);
  let second: number | null = null;
  let from = 0;
  for (let tried = 0; tried < mostCandidates && from <= text.length && matcher.find(from); tried++) {
    from = matcher.start() + 1;
    const values = Object.fromEntries(
      pattern.fields.map((field, n) => [field, Number(matcher.group(n + 1))]),
    );
    const ms = dateMs(values as Partial<Record<Field, number>>);
    if (ms === null) continue;
    if (!/[0-9]/.test(text.charAt(matcher.start() - 1)) && !/[0-9]/.test(text.charAt(matcher.end()))) {
      return { ms, zoned: false, origin: 'file-name' };
    }
    second ??= ms;
  }
  return second === null ? null : { ms: second, zoned: false, origin: 'file-name' };
}

function dateMs(fields: Partial<Record<Field, number>>): number | null {
  const { year = 0, month = 0, day = 0, hour = 0, minute = 0, second = 0 } = fields;
  return realDateMs(year, month, day, hour, minute, second);
}

/** Milliseconds since 1970 of a date between 1970 and 2199 as if it were UTC; null where no calendar has it. */
export function realDateMs(
  year: number,
  month: number,
  day: number,
  hour: number,
  minute: number,
  second: number,
): number | null {
  if (!(year >= 1970 && year <= 2199) || hour > 23 || minute > 59 || second > 59) return null;
  const ms = Date.UTC(year, month - 1, day, hour, minute, second);
  const date = new Date(ms);
  return date.getUTCMonth() === month - 1 && date.getUTCDate() === day ? ms : null;
}
