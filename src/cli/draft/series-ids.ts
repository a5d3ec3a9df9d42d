import type { NamePart } from './name-parts.ts';
import type { NameSeries } from './name-series.ts';
import { isFiller, isPlaceWord } from './place-words.ts';

/** Columns of a series from and including `from` up to `to`, and what stands there. */
export interface Stretch {
  readonly from: number;
  readonly to: number;
  readonly text: string;
}

/** Which words of a name are the machine and which the point; null: no word is. */
export interface SeriesIds {
  readonly machine: Stretch | null;
  readonly point: Stretch | null;
  /** The same as ids of the site file; '' where no word is. */
  readonly machineId: string;
  readonly pointId: string;
}

interface Word extends Stretch {
  readonly varies: boolean;
  readonly inFolder: boolean;
}

/**
 * A guess: words that read as measuring places are the point; of the others the last that varies is the point when
 * several vary, and what stands before it the machine.
 */
export function seriesIds(series: NameSeries): SeriesIds {
  const words = wordsOf(series);
  const places = words.filter(({ text }) => isPlaceWord(text));
  const others = words.filter((word) => !isPlaceWord(word.text));
  const telling = others.filter((word) => word.varies || !isFiller(word.text));
  const named = telling.length > 0 ? telling : others.filter(({ text }) => /\p{L}/u.test(text));
  const [machine, point] = places.length > 0 ? [machineOf(named), places] : bothOf(named);
  const [machineText, pointText] = [stretchOf(series, machine), stretchOf(series, point)];
  return {
    machine: machineText,
    point: pointText,
    machineId: machineText?.text ?? idOf(machine),
    pointId: pointText?.text ?? idOf(point),
  };
}

/** From the first word that varies on; without one, all of them. */
function machineOf(words: readonly Word[]): readonly Word[] {
  const first = words.findIndex(({ varies }) => varies);
  return words.slice(Math.max(0, first));
}

function bothOf(words: readonly Word[]): readonly [readonly Word[], readonly Word[]] {
  const folder = words.findLastIndex(({ inFolder }) => inFolder);
  const varying = words.flatMap(({ varies }, index) => (varies ? [index] : []));
  const last = varying.at(-1);
  if (last === undefined) {
    const machine = folder >= 0 ? folder + 1 : 1;
    return [words.slice(0, machine), words.slice(machine)];
  }
  if (varying.length > 1) return [machineOf(words.slice(0, last)), words.slice(last)];
  // One word varies: in a file of a folder that does not, the folder is the machine.
  if (folder >= 0 && last > folder) return [words.slice(0, folder + 1), words.slice(folder + 1)];
  return [words.slice(last, last + 1), words.slice(last + 1)];
}

/** Words between marks other than - and blanks; where there is but one, its parts between those, with their numbers. */
function wordsOf(series: NameSeries): Word[] {
  const apart = (part: NamePart) => part.kind === 'mark';
  const words = joinNumbers(
    series,
    splitAt(series, (part) => apart(part) && part.text !== '-' && part.text !== ' '),
  );
  return words.length > 1 ? words : joinNumbers(series, splitAt(series, apart));
}

function splitAt(series: NameSeries, separates: (part: NamePart) => boolean): Word[] {
  const { parts, roles, ending } = series;
  const fileFrom = parts.findLastIndex(({ text }) => text === '/') + 1;
  const words: Word[] = [];
  let from = 0;
  for (let column = 0; column <= ending; column++) {
    const part = parts[column];
    const inside = column < ending && part !== undefined && roles[column] !== 'any' && !separates(part);
    if (inside) continue;
    const word = trimmed(series, from, column);
    if (word !== null) {
      const varies = roles.slice(word.from, word.to).includes('id');
      words.push({ ...word, varies, inFolder: word.to <= fileFrom });
    }
    from = column + 1;
  }
  return words;
}

/** Without marks at its ends. */
function trimmed({ parts }: NameSeries, from: number, to: number): Stretch | null {
  let [first, behind] = [from, to];
  while (first < behind && parts[first]?.kind === 'mark') first++;
  while (first < behind && parts[behind - 1]?.kind === 'mark') behind--;
  return first === behind ? null : stretch(parts, first, behind);
}

/** A short number belongs to the word before it: 'blower', '1', 'de' -> 'blower-1', 'de'. */
function joinNumbers({ parts }: NameSeries, words: readonly Word[]): Word[] {
  const joined: Word[] = [];
  for (const word of words) {
    const before = joined.at(-1);
    const apart = parts[word.from - 1]?.text;
    if (before?.to === word.from - 1 && apart !== '/' && /^[0-9]{1,3}$/.test(word.text)) {
      joined[joined.length - 1] = {
        ...stretch(parts, before.from, word.to),
        varies: before.varies || word.varies,
        inFolder: before.inFolder,
      };
    } else joined.push(word);
  }
  return joined;
}

function stretch(parts: readonly NamePart[], from: number, to: number): Stretch {
  const text = parts
    .slice(from, to)
    .map((part) => part.text)
    .join('');
  return { from, to, text };
}

/** The words as one stretch where they stand side by side and can be an id as they are; else null. */
function stretchOf({ parts, roles }: NameSeries, words: readonly Word[]): Stretch | null {
  const [first, last] = [words[0], words.at(-1)];
  if (first === undefined || last === undefined) return null;
  const whole = stretch(parts, first.from, last.to);
  const gaps = roles.slice(first.from, last.to).includes('any');
  const between = words.every((word, n) => n === 0 || word.from === (words[n - 1] as Word).to + 1);
  return gaps || !between || plainId(whole.text) !== whole.text ? null : whole;
}

function idOf(words: readonly Word[]): string {
  return plainId(words.map(({ text }) => text).join('-'));
}

/** Letters, digits, '-', '_', '.'; the first a letter or digit; at most 60. */
export function plainId(text: string): string {
  return text
    .replace(/[^\p{L}\p{N}._-]+/gu, '-')
    .replace(/^[^\p{L}\p{N}]+|[-_.]+$/gu, '')
    .slice(0, 60);
}
