import { nearest } from '../config/nearest.ts';
import { type Band, type Machine, type Point, pointPath, type Site } from '../config/site.ts';

/** Machines, points and bands as people name them on the command line; a wrong name is answered with the nearest known. */
type Found<T> = T | { readonly unknown: string };

/** `MACHINE/POINT`. */
export function findPoint(
  site: Site,
  path: string,
): Found<{ readonly machine: Machine; readonly point: Point }> {
  const points = site.machines.flatMap((machine) => machine.points.map((point) => ({ machine, point })));
  const found = points.find(({ point }) => pointPath(point) === path);
  if (found !== undefined) return found;
  const [machineId = ''] = path.split('/');
  const machine = site.machines.find(({ id }) => id === machineId);
  if (machine === undefined) {
    const ids = site.machines.map(({ id }) => id);
    return { unknown: `there is no machine '${machineId}' in the site file${meant(machineId, ids)}` };
  }
  const ids = machine.points.map(pointPath);
  const asked = path.includes('/')
    ? `there is no point '${path}' in the site file`
    : `'${path}' names no point`;
  return { unknown: `${asked}${meant(path, ids)}` };
}

/** `MACHINE` or `MACHINE/POINT`; point null: the whole machine. */
export function findPlace(
  site: Site,
  path: string,
): Found<{ readonly machine: Machine; readonly point: Point | null }> {
  if (path.includes('/')) return findPoint(site, path);
  const machine = site.machines.find(({ id }) => id === path);
  if (machine !== undefined) return { machine, point: null };
  return {
    unknown: `there is no machine '${path}' in the site file${meant(
      path,
      site.machines.map(({ id }) => id),
    )}`,
  };
}

export function findBand(point: Point, id: string): Found<Band> {
  const found = point.bands.find((band) => band.id === id);
  if (found !== undefined) return found;
  const ids = point.bands.map((band) => band.id);
  return { unknown: `${pointPath(point)} has no band '${id}'${meant(id, ids)}` };
}

/** `; did you mean X?`, else what there is. */
function meant(word: string, known: readonly string[]): string {
  const near = nearest(word, known);
  if (near !== null) return `; did you mean '${near}'?`;
  if (known.length === 0) return '; there is none';
  const shown = known.slice(0, 8).join(', ');
  return `; there ${known.length === 1 ? 'is' : 'are'} ${shown}${known.length > 8 ? ` and ${known.length - 8} more` : ''}`;
}
