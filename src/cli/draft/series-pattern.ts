import { pathTest } from '../../acquisition/path-pattern.ts';
import {
  commonName,
  type ExpandedPattern,
  expandPattern,
  parseFilePattern,
} from '../../config/file-pattern.ts';
import type { NameSeries } from './name-series.ts';
import type { Stretch } from './series-ids.ts';

/** How the site file names the files of one series. */
export interface FilesSetting {
  readonly key: 'files' | 'files_regex';
  readonly text: string;
}

export interface NamedSeries {
  readonly series: NameSeries;
  /** Where the ids stand in the names letter by letter; null where they do not. */
  readonly machine: Stretch | null;
  readonly point: Stretch | null;
  readonly machineId: string;
  /** Id of its only point; null for several. */
  readonly pointId: string | null;
}

/**
 * A pattern for each series that takes its files and no other of the folder: with ids and <any> where that does it,
 * else a regular expression that holds every letter and the number of digits. `others`: paths that nobody shall take.
 */
export function filesSettings(all: readonly NamedSeries[], others: readonly string[]): FilesSetting[] {
  const patterns = all.map((one) => patternText(one));
  const expanded = all.map(({ machineId, pointId }, n) =>
    expandPattern(patterns[n] as string, machineId, pointId ?? ''),
  );
  const owners = new Map<string, number>();
  all.forEach(({ series }, index) => {
    for (const { path } of series.files) owners.set(path, index);
  });
  const loose = new Set<number>();
  all.forEach((_, index) => {
    if (!parseFilePattern(patterns[index] as string).ok) {
      loose.add(index);
      return;
    }
    const fits = pathTest((expanded[index] as (string | null)[]).map((part) => part ?? '<any>').join(''));
    const wrong = [...owners].some(([path, owner]) => fits(path) !== (owner === index));
    if (wrong || others.some(fits)) loose.add(index);
  });
  // What could meet in a file yet to come is an error of the site file where both take the same channel.
  for (let one = 0; one < all.length; one++) {
    for (let other = one + 1; other < all.length; other++) {
      if (loose.has(one) && loose.has(other)) continue;
      if (!mayMeet(expanded[one] ?? [], expanded[other] ?? [])) continue;
      if (commonName(expanded[one] ?? [], expanded[other] ?? []) === null) continue;
      loose.add(one);
      loose.add(other);
    }
  }
  return all.map(({ series }, index) =>
    loose.has(index)
      ? { key: 'files_regex', text: regexText(series) }
      : { key: 'files', text: patterns[index] as string },
  );
}

/** False where the letters ahead of the first <any> differ already. */
function mayMeet(one: ExpandedPattern, other: ExpandedPattern): boolean {
  const heads = [one, other].map((parts) => {
    const first = parts.indexOf(null);
    return parts.slice(0, first < 0 ? parts.length : first).join('');
  });
  const [a = '', b = ''] = heads;
  return a.startsWith(b) || b.startsWith(a);
}

function patternText({ series, machine, point }: NamedSeries): string {
  const { parts, roles } = series;
  let text = '';
  for (let column = 0; column < parts.length; column++) {
    const id = column === machine?.from ? machine : column === point?.from ? point : null;
    if (id !== null) {
      text += id === machine ? '<machine>' : '<point>';
      column = id.to - 1;
    } else if (roles[column] === 'any') text += text.endsWith('<any>') ? '' : '<any>';
    else text += parts[column]?.text ?? '';
  }
  return text;
}

/** Letters as they stand, digits by their number, so that two tables of names never share a file. */
function regexText({ parts, roles, widths, date }: NameSeries): string {
  const pieces = parts.map(({ kind, text }, column) => {
    const kept = roles[column] !== 'any' || kind === 'mark' || date?.columns.has(column) === true;
    if (kept && !(kind === 'digits' && roles[column] === 'any'))
      return text.replace(/[\\^$.*+?()[\]{}|]/g, '\\$&');
    if (kind === 'letters') return '\\p{L}+';
    return typeof widths[column] === 'number' ? `[0-9]{${widths[column]}}` : '[0-9]+';
  });
  return `^${pieces.join('')}$`;
}
