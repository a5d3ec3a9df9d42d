import { RE2JS } from 're2js';
import { type Point, pointPath, type Site } from '../config/site.ts';
import { printableName } from './file-name.ts';
import { fillPattern, pathTest, patternDistance } from './path-pattern.ts';

/**
 * Which points a file in the drop folder belongs to. A point's `files` must fit the whole path below the drop
 * folder; a point without one takes every file that lies directly in it. Names are compared letter by letter,
 * capitals included.
 */
export interface SiteFiles {
  /** The points that take the file, in the order of the site file; empty: unassigned. */
  pointsFor(path: string): readonly Point[];
  /**
   * The series of names that the file belongs to, as one logger writes it: the pattern with its ids filled and
   * `<any>` left. Where points take a file by several patterns, the first one's. Null where no point takes it.
   */
  sourceOf(path: string): string | null;
  /** Hidden, unfinished (`.part`), or named by `ignore` and taken by no point; sidecars are no recordings either. */
  isIgnored(path: string): boolean;
  /** Source names with the points behind them, in the order of the site file. */
  readonly sources: readonly SourcePattern[];
}

export interface SourcePattern {
  readonly source: string;
  readonly points: readonly Point[];
  readonly fits: (path: string) => boolean;
  /** The filled pattern; null for a regular expression. */
  readonly filled: string | null;
}

/** A path that no point takes, and the pattern that comes nearest. */
export interface Mismatch {
  readonly nearest: string | null;
  readonly points: readonly string[];
  /** Character of the path, counted from 1, from which on it differs; null where that cannot be said. */
  readonly differsAt: number | null;
  readonly text: string;
}

/**
 * Reads the patterns of a site. `files_regex` is compared with the whole path too, in linear time (RE2); groups named
 * `machine` and `point` in it must hold the point's ids.
 */
export function siteFiles(site: Site): SiteFiles {
  const sources = sourcesOf(site);
  const ignores = ignoreTests(site);
  const all = site.machines.flatMap((machine) => machine.points);
  const fitting = (path: string) => sources.filter((source) => source.fits(path));
  const pointsFor = (path: string): readonly Point[] => {
    if (isNoRecording(path)) return [];
    const taking = new Set(fitting(path).flatMap((source) => source.points));
    return taking.size === 0 ? [] : all.filter((point) => taking.has(point) && !ignores.byPoint(point, path));
  };
  return {
    sources,
    pointsFor,
    sourceOf: (path) => fitting(path)[0]?.source ?? null,
    isIgnored: (path) => isNoRecording(path) || (ignores.any(path) && pointsFor(path).length === 0),
  };
}

/** Hidden, in a hidden folder, still being written under `.part`, or a sidecar. */
export function isNoRecording(path: string): boolean {
  return path.split('/').some((name) => name.startsWith('.')) || /\.(part|json)$/i.test(path);
}

/** A site is frozen, so its patterns are read once. */
const known = new WeakMap<Site, readonly SourcePattern[]>();

function sourcesOf(site: Site): readonly SourcePattern[] {
  const sources = known.get(site) ?? readSources(site);
  known.set(site, sources);
  return sources;
}

function readSources(site: Site): SourcePattern[] {
  const byName = new Map<string, SourcePattern & { points: Point[] }>();
  for (const point of site.machines.flatMap((machine) => machine.points)) {
    const found = sourceOfPoint(point);
    const earlier = byName.get(found.source);
    if (earlier === undefined) byName.set(found.source, { ...found, points: [point] });
    else earlier.points.push(point);
  }
  return [...byName.values()];
}

function sourceOfPoint(point: Point): Omit<SourcePattern, 'points'> {
  const { files, filesRegex } = point.recordings;
  if (filesRegex !== null && files === null) return regexSource(filesRegex, point);
  const filled = fillPattern(files ?? '<any>', point.machineId, point.id);
  return { source: filled, filled, fits: pathTest(filled) };
}

function regexSource(regex: string, point: Point): Omit<SourcePattern, 'points'> {
  const compiled = RE2JS.compile(regex);
  const wanted = Object.entries({ machine: point.machineId, point: point.id }).filter(
    ([group]) => group in compiled.namedGroups(),
  );
  return {
    source: [regex, ...wanted.map(([group, id]) => `${group}=${id}`)].join(' '),
    filled: null,
    fits: (path) => {
      const matcher = compiled.matcher(path);
      return matcher.matches() && wanted.every(([group, id]) => matcher.group(group) === id);
    },
  };
}

/** An `ignore` pattern without / is compared with the name in whatever folder it lies. */
function ignoreTests(site: Site) {
  const tests = new Map<string, (path: string) => boolean>();
  for (const point of site.machines.flatMap((machine) => machine.points)) {
    for (const pattern of point.recordings.ignore) {
      if (tests.has(pattern)) continue;
      const fits = pathTest(pattern);
      const whole = pattern.includes('/');
      tests.set(pattern, (path) => fits(whole ? path : path.slice(path.lastIndexOf('/') + 1)));
    }
  }
  return {
    any: (path: string) => [...tests.values()].some((test) => test(path)),
    byPoint: (point: Point, path: string) =>
      point.recordings.ignore.some((pattern) => tests.get(pattern)?.(path) === true),
  };
}

/** For people: the pattern nearest to a path that no point takes, and where the two part. */
export function explainMismatch(path: string, site: Site): Mismatch {
  const candidates = sourcesOf(site)
    .filter((source) => source.filled !== null)
    .map((source) => ({ source, ...patternDistance(path, source.filled as string) }))
    .sort((a, b) => a.distance - b.distance);
  const best = candidates[0];
  if (best === undefined || !isNear(path, best.source.filled as string)) {
    return {
      nearest: null,
      points: [],
      differsAt: null,
      text: 'no pattern of the site file is near this name',
    };
  }
  const filled = best.source.filled as string;
  const points = best.source.points.map(pointPath);
  const rest = printableName(path.slice(best.fitsUpTo)) || 'the end of the name';
  return {
    nearest: filled,
    points,
    differsAt: best.fitsUpTo + 1,
    text: `nearest pattern ${filled} (${shortList(points)}): ${difference(path, filled, best.fitsUpTo, rest)}`,
  };
}

/**
 * Whether a name was likely meant for a pattern: at most a third of the pattern's letters differ (two of a short one),
 * capitals and folders aside. Any name shares an ending with some pattern, which says nothing.
 */
function isNear(path: string, filled: string): boolean {
  const last = (text: string) => text.slice(text.lastIndexOf('/') + 1).toLowerCase();
  const letters = (text: string) => text.replaceAll('<any>', '').length;
  const near = (name: string, pattern: string) =>
    patternDistance(name, pattern).distance <= Math.max(2, Math.floor(letters(pattern) / 3));
  return near(path.toLowerCase(), filled.toLowerCase()) || near(last(path), last(filled));
}

function difference(path: string, filled: string, fitsUpTo: number, rest: string): string {
  if (pathTest(filled.toLowerCase())(path.toLowerCase())) {
    return `differs in capitals, from character ${fitsUpTo + 1} on, at "${rest}"`;
  }
  const folders = path.split('/').length - filled.split('/').length;
  if (folders > 0) return 'the file lies in a subfolder that the pattern does not name';
  if (folders < 0) return 'the pattern names a subfolder in which the file does not lie';
  // <any> takes everything up to the end; then it is the end that is missing.
  const ending = filled.slice(filled.lastIndexOf('<any>') + '<any>'.length);
  if (fitsUpTo === path.length && filled.includes('<any>') && !path.endsWith(ending)) {
    return `does not end in "${ending}"`;
  }
  return `differs from character ${fitsUpTo + 1} on, at "${rest}"`;
}

function shortList(names: readonly string[]): string {
  return names.length <= 3
    ? names.join(', ')
    : `${names.slice(0, 2).join(', ')} and ${names.length - 2} more`;
}
