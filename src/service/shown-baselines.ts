import type { Band, Machine, Point } from '../config/site.ts';
import { baselinesOf, type StoredBaseline } from '../store/baselines.ts';
import { conditionNames } from '../store/conditions.ts';
import type { Reader } from '../store/lent-connection.ts';
import { seriesOfPoint } from '../store/read-trends.ts';
import { readSiteIds } from '../store/site-ids.ts';
import type { Place } from './machine-acts.ts';

/** Baselines of a machine or a point as they stand, in the order of the site file; the newest series of each band. */
export interface ShownBaseline {
  readonly machine: Machine;
  readonly point: Point;
  readonly band: Band;
  /** Operating condition; '' where the machine lists none. */
  readonly condition: string;
  /** Null: no whole day of levels yet. */
  readonly baseline: StoredBaseline | null;
}

export async function shownBaselines(reader: Reader, { machine, point }: Place): Promise<ShownBaseline[]> {
  const ids = await readSiteIds(reader);
  if (ids === null) return [];
  const names = await conditionNames(reader);
  const shown: ShownBaseline[] = [];
  for (const one of point === null ? machine.points : [point]) {
    const series = await seriesOfPoint(reader, ids.pointId(machine.id, one.id));
    for (const band of one.bands) {
      const bandId = ids.bandId(machine.id, one.id, band.id);
      const newest = series.filter((each) => each.bandId === bandId).at(-1);
      const baselines = newest === undefined ? [] : await baselinesOf(reader, [newest.id]);
      const of = { machine, point: one, band };
      if (baselines.length === 0) shown.push({ ...of, condition: '', baseline: null });
      for (const baseline of baselines)
        shown.push({ ...of, condition: names.get(baseline.conditionId) ?? '', baseline });
    }
  }
  return shown;
}
