import type { Site } from '../config/site.ts';
import type { Reader } from '../store/lent-connection.ts';
import { readSiteIds, type SiteIds } from '../store/site-ids.ts';
import { type SiteView, siteView } from './site-view.ts';

/**
 * The site file with the ids that the ledger has for it, for commands beside the service. Null where the ledger does not
 * know all of it: the service has not taken this text over.
 */
export async function readersView(reader: Reader, site: Site): Promise<SiteView | null> {
  const ids = await readSiteIds(reader);
  return ids === null || !knowsAll(ids, site) ? null : siteView(site, ids);
}

function knowsAll(ids: SiteIds, site: Site): boolean {
  try {
    for (const machine of site.machines) {
      ids.machineId(machine.id);
      for (const point of machine.points) {
        ids.pointId(machine.id, point.id);
        for (const { id } of point.bands) ids.bandId(machine.id, point.id, id);
        for (const { id } of point.limits) ids.limitId(machine.id, point.id, id);
      }
    }
    return true;
  } catch {
    return false;
  }
}
