import { basename, isAbsolute, relative } from 'node:path';
import { explainMismatch, type SiteFiles, siteFiles } from '../../acquisition/file-pattern.ts';
import { nothingSaid } from '../../config/sample-layout.ts';
import type { Point, Site } from '../../config/site.ts';
import { usualSpeed } from '../../config/speed-settings.ts';
import type { AnalysisPlan, PlanFor, PlannedFile } from '../../service/analyse-file.ts';

/** Deepest folder below the drop folder whose name may take part in a pattern. */
const deepest = 16;

/**
 * What the points of a site file make of a file: those that take it by its name. In the drop folder that is its path
 * below it; elsewhere its name, or as many of its folders as a pattern asks for. The mark of a second file of one name
 * in archive or quarantine is no part of it.
 */
export function plansOfSite(site: Site, path: string): PlannedFile {
  const files = siteFiles(site);
  const points = pointsTaking(files, site, path);
  const machines = new Map(site.machines.map((machine) => [machine.id, machine]));
  const planFor: PlanFor = (_header, sidecar): AnalysisPlan | { readonly reason: string } => {
    const [first] = points;
    if (first === undefined) {
      const { text } = explainMismatch(basename(path), site);
      return { reason: `no point of the site file takes a file of this name; ${text}` };
    }
    return {
      points: points.map((point) => ({
        point,
        nominalHz: machines.get(point.machineId)?.runningSpeedHz ?? null,
        speed: machines.get(point.machineId)?.speed ?? usualSpeed,
        parts: machines.get(point.machineId)?.parts,
      })),
      sidecar,
      clock: first.recordings.clock,
      siteZone: site.timeZone,
      startInName:
        points.find(({ recordings }) => recordings.startInName !== null)?.recordings.startInName ?? null,
    };
  };
  return { layout: points[0]?.recordings.layout ?? nothingSaid, planFor };
}

function pointsTaking(files: SiteFiles, site: Site, path: string): readonly Point[] {
  const below = relative(site.folders.drop, path);
  const inDrop = !below.startsWith('..') && !isAbsolute(below);
  const names = inDrop ? [below] : endings(path);
  for (const name of names) {
    const points = files.pointsFor(name);
    if (points.length > 0) return points;
  }
  return [];
}

/** NAME, FOLDER/NAME, ..., with and without the mark of a second file. */
function endings(path: string): string[] {
  const parts = path.split('/').filter((part) => part !== '');
  const all: string[] = [];
  for (let n = 1; n <= Math.min(parts.length, deepest); n++) {
    const name = parts.slice(-n).join('/');
    all.push(name, name.replace(/~[0-9a-f]{8}(~[2-9])?$/, ''));
  }
  return all;
}
