import { printableName } from '../../acquisition/file-name.ts';
import { siteFiles } from '../../acquisition/file-pattern.ts';
import { type NamePattern, namePattern, startInName } from '../../acquisition/start-in-name.ts';
import { sweepFolder } from '../../acquisition/sweep.ts';
import { type Point, pointPath, type Site } from '../../config/site.ts';

/** What lies in the drop folder for a point. */
export interface Waiting {
  readonly files: number;
  /** Path below the drop folder of the newest by the start in its name, else by its time of change. */
  readonly newest: string;
  readonly newestMs: number;
}

export interface DropLook {
  /** In words why the folder cannot be read; null: it was. */
  readonly problem: string | null;
  /** By `machine/point`. */
  readonly waiting: ReadonlyMap<string, Waiting>;
  /** Files that no point takes, made harmless for people. */
  readonly unassigned: readonly string[];
  /** There was more than is looked at. */
  readonly cut: boolean;
}

export async function lookAtDrop(site: Site): Promise<DropLook> {
  const { drop, data } = site.folders;
  const sweep = await sweepFolder(drop, [data]);
  if (sweep.state !== 'read')
    return { problem: sweep.reason, waiting: new Map(), unassigned: [], cut: false };
  const files = siteFiles(site);
  const patterns = new Map<string, NamePattern>();
  const waiting = new Map<string, Waiting>();
  const unassigned: string[] = [];
  for (const file of sweep.files) {
    if (file.nameProblem !== null || files.isIgnored(file.path)) continue;
    const points = files.pointsFor(file.path);
    if (points.length === 0) unassigned.push(printableName(file.path));
    for (const point of points) {
      const atMs = startedMs(point, file.path, patterns) ?? file.mtimeMs;
      const before = waiting.get(pointPath(point));
      const newer = before === undefined || atMs >= before.newestMs;
      waiting.set(pointPath(point), {
        files: (before?.files ?? 0) + 1,
        newest: newer ? file.path : before.newest,
        newestMs: newer ? atMs : before.newestMs,
      });
    }
  }
  return { problem: null, waiting, unassigned, cut: sweep.cut };
}

function startedMs(point: Point, path: string, patterns: Map<string, NamePattern>): number | null {
  const text = point.recordings.startInName;
  if (text === null) return null;
  const pattern = patterns.get(text) ?? namePattern(text);
  patterns.set(text, pattern);
  return startInName(pattern, path)?.ms ?? null;
}
