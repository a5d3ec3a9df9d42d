import { type SiteFiles, siteFiles } from '../acquisition/file-pattern.ts';
import type { StatedStart } from '../acquisition/recording.ts';
import { type NamePattern, namePattern, startInName } from '../acquisition/start-in-name.ts';
import { type Machine, type Point, pointPath, type Site } from '../config/site.ts';
import type { SiteIds } from '../store/site-ids.ts';
import { namedBy } from './suppressions-due.ts';

/**
 * The site file in force, with what is looked up for every file worked out once. A reload makes a new one; a decision
 * holds on to the one it began with.
 */
export interface SiteView {
  readonly site: Site;
  readonly ids: SiteIds;
  readonly files: SiteFiles;
  readonly points: readonly Point[];
  /** Machines on whose state or troubles `suppressed_while` of some limit depends. */
  readonly namedInSuppressions: ReadonlySet<string>;
  machine(id: string): Machine;
  point(path: string): Point | undefined;
  /** The start that the name of a file states, by the pattern of the points that take it. */
  startInName(path: string, points: readonly Point[]): StatedStart | null;
}

export function siteView(site: Site, ids: SiteIds): SiteView {
  const machines = new Map(site.machines.map((machine) => [machine.id, machine]));
  const points = site.machines.flatMap((machine) => machine.points);
  const byPath = new Map(points.map((point) => [pointPath(point), point]));
  const patterns = new Map<string, NamePattern>();
  for (const { recordings } of points) {
    if (recordings.startInName === null) continue;
    patterns.set(recordings.startInName, namePattern(recordings.startInName));
  }
  return {
    site,
    ids,
    files: siteFiles(site),
    points,
    namedInSuppressions: namedBy(points),
    machine(id) {
      const machine = machines.get(id);
      if (machine === undefined) throw new Error(`no machine ${id} in the site file`);
      return machine;
    },
    point: (path) => byPath.get(path),
    startInName(path, taking) {
      for (const { recordings } of taking) {
        const pattern = recordings.startInName === null ? undefined : patterns.get(recordings.startInName);
        const start = pattern === undefined ? null : startInName(pattern, path);
        if (start !== null) return start;
      }
      return null;
    },
  };
}
