import { RE2JS } from 're2js';
import { nearest } from './nearest.ts';
import { type Parsed, refused, shorten, understood } from './quantity.ts';

const filePlaces = ['any', 'machine', 'point'];
const startPlaces = ['year', 'month', 'day', 'hour', 'minute', 'second', 'any'];
const neededStartPlaces = ['year', 'month', 'day', 'hour', 'minute'];

/** `<machine>_<any>.wav`: <any> any text without a /, / a subfolder of the drop folder, <machine> <point> their ids. */
export function parseFilePattern(text: string): Parsed<string> {
  const pattern = text.trim();
  if (pattern.includes('\\')) return refused('folders are parted by /', pattern.replaceAll('\\', '/'));
  if (/^\/|^[A-Za-z]:/.test(pattern)) {
    return refused(
      `'${shorten(pattern)}' is a path, a pattern is seen from the drop folder`,
      pattern.slice(pattern.lastIndexOf('/') + 1),
    );
  }
  if (pattern.split('/').some((part) => part === '' || part === '.' || part === '..')) {
    return refused(`'${shorten(pattern)}' has an empty part, '.' or '..'`);
  }
  if (/[*?]/.test(pattern))
    return refused(`'${shorten(pattern)}': * and ? have no meaning here`, pattern.replace(/[*?]+/g, '<any>'));
  return withPlaces(pattern, filePlaces);
}

/** `<year><month><day>T<hour><minute><second>Z`, found anywhere in the name. */
export function parseStartPattern(text: string): Parsed<string> {
  const pattern = withPlaces(text.trim(), startPlaces);
  if (!pattern.ok) return pattern;
  const missing = neededStartPlaces.find((place) => !pattern.value.includes(`<${place}>`));
  if (missing !== undefined) return refused(`'${shorten(text)}' has no <${missing}>, so it gives no start`);
  const twice = startPlaces.find((place) => place !== 'any' && pattern.value.split(`<${place}>`).length > 2);
  return twice === undefined ? pattern : refused(`'${shorten(text)}' has <${twice}> twice`);
}

function withPlaces(pattern: string, known: readonly string[]): Parsed<string> {
  for (const [written, name] of pattern.matchAll(/<([^<>]*)>/g)) {
    if (known.includes(name)) continue;
    const meant = nearest(name, known);
    const what = `${written} is none of ${known.map((place) => `<${place}>`).join(' ')}`;
    return refused(what, meant === null ? null : pattern.replace(written, `<${meant}>`));
  }
  if (pattern === '') return refused('the pattern is empty');
  const left = pattern.replace(/<[^<>]*>/g, '');
  return /[<>]/.test(left)
    ? refused(`'${shorten(pattern)}' has a < or > that is not closed`)
    : understood(pattern);
}

/**
 * A regular expression in RE2 syntax, which runs in linear time. Look-around and back-references are refused: no
 * linear engine has them.
 */
export function parseFilesRegex(text: string): Parsed<string> {
  const look = /\(\?(<?[=!])/.exec(text);
  if (look !== null)
    return refused(`look-around such as (?${look[1]} is not available, since it can take unbounded time`);
  if (/(^|[^\\])(\\\\)*\\[1-9]/.test(text)) {
    return refused('a back-reference is not available, since it can take unbounded time');
  }
  try {
    RE2JS.compile(text);
    return understood(text);
  } catch (error) {
    const why =
      error instanceof Error ? error.message.replace(/^error parsing regexp: /, '') : 'not understood';
    return refused(`no regular expression in RE2 syntax: ${shorten(why)}`);
  }
}

/** The pattern of one point: ids in place, <any> as null between literal texts. */
export type ExpandedPattern = readonly (string | null)[];

export function expandPattern(pattern: string, machineId: string, pointId: string): ExpandedPattern {
  const parts: (string | null)[] = [];
  for (const part of pattern.split(/(<any>)/)) {
    if (part === '<any>') parts.push(null);
    else if (part !== '') parts.push(part.replaceAll('<machine>', machineId).replaceAll('<point>', pointId));
  }
  return parts;
}

/**
 * A file name that both patterns take, or null where there is none; <any> takes any text without a /, the empty one
 * too. Looks at each pair of positions once: work in proportion to the product of the two lengths.
 */
export function commonName(a: ExpandedPattern, b: ExpandedPattern): string | null {
  const left = symbols(a);
  const right = symbols(b);
  const width = right.length + 1;
  /** From which pair of positions this one was reached, and -1 where it was not. */
  const before = new Int32Array((left.length + 1) * width).fill(-1);
  before[0] = 0;
  for (let i = 0; i <= left.length; i++) {
    for (let j = 0; j <= right.length; j++) {
      const here = i * width + j;
      if (before[here] < 0) continue;
      const one = left[i];
      const other = right[j];
      const letters = typeof one === 'string' && one === other;
      if (letters && before[here + width + 1] < 0) before[here + width + 1] = here;
      if ((one === null || takes(other, one)) && before[here + width] < 0) before[here + width] = here;
      if ((other === null || takes(one, other)) && before[here + 1] < 0) before[here + 1] = here;
    }
  }
  const end = left.length * width + right.length;
  return before[end] < 0 ? null : nameAlong(before, end, left, right, width);
}

/** Does <any> (null) swallow this letter? */
function takes(symbol: string | null | undefined, letter: string | null | undefined): boolean {
  return symbol === null && typeof letter === 'string' && letter !== '/';
}

function nameAlong(
  before: Int32Array,
  end: number,
  left: readonly (string | null)[],
  right: readonly (string | null)[],
  width: number,
): string {
  let name = '';
  for (let at = end; at > 0; at = before[at]) {
    const from = before[at];
    const movedLeft = Math.floor(at / width) > Math.floor(from / width);
    const letter = movedLeft ? left[Math.floor(from / width)] : right[from % width];
    name = `${letter ?? ''}${name}`;
  }
  return name;
}

function symbols(pattern: ExpandedPattern): (string | null)[] {
  return pattern.flatMap((part) => (part === null ? [null] : [...part]));
}
