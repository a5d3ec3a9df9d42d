import type { Site } from '../config/site.ts';
import { carryAlarmKeys } from './alarm-keys.ts';
import { type StoredAlarm, standingOfRetired } from './alarms.ts';
import type { Writer } from './lent-connection.ts';
import { key, SiteRows } from './site-rows.ts';

/** Surrogate ids of what is in the site file now, by the ids that people use. Asking for anything else is a mistake. */
export interface SiteIds {
  readonly configVersionId: number;
  machineId(machine: string): number;
  pointId(machine: string, point: string): number;
  bandId(machine: string, point: string, band: string): number;
  limitId(machine: string, point: string, limit: string): number;
}

export interface SiteSynced {
  readonly ids: SiteIds;
  /** Alarms and troubles that still stand although what they are about has vanished; to be closed by `limit-removed`. */
  readonly orphans: readonly StoredAlarm[];
}

/**
 * Makes the ledger know the site file: config version, a row for each machine, point, band and limit; carries rows over
 * a renaming (`formerly`) with their series and alarms, retires what vanished, brings back what returned. The same site
 * again changes nothing. `text` is the site file as read.
 */
export async function syncSite(
  writer: Writer,
  site: Site,
  now: { readonly text: string; readonly wallMs: number },
): Promise<SiteSynced> {
  const configVersionId = await keepConfigVersion(writer, site.configVersion, now);
  const ids = await new SiteRows(writer, now.wallMs).keep(site.machines);
  const orphans = await standingOfRetired(writer);
  await carryAlarmKeys(writer);
  return { ids: new IdLookup(configVersionId, ids), orphans };
}

async function keepConfigVersion(
  writer: Writer,
  sha256: string,
  now: { readonly text: string; readonly wallMs: number },
): Promise<number> {
  await writer
    .insertInto('config_versions')
    .values({ sha256, loaded_ms: now.wallMs, text: now.text })
    .onConflict((conflict) => conflict.column('sha256').doNothing())
    .execute();
  const row = await writer
    .selectFrom('config_versions')
    .select('id')
    .where('sha256', '=', sha256)
    .executeTakeFirstOrThrow();
  return row.id;
}

class IdLookup implements SiteIds {
  readonly configVersionId: number;
  readonly #ids: ReadonlyMap<string, number>;

  constructor(configVersionId: number, ids: ReadonlyMap<string, number>) {
    this.configVersionId = configVersionId;
    this.#ids = ids;
  }

  machineId(machine: string): number {
    return this.#get(key(machine));
  }

  pointId(machine: string, point: string): number {
    return this.#get(key(machine, point));
  }

  bandId(machine: string, point: string, band: string): number {
    return this.#get(key(machine, point, 'band', band));
  }

  limitId(machine: string, point: string, limit: string): number {
    return this.#get(key(machine, point, 'limit', limit));
  }

  #get(path: string): number {
    const id = this.#ids.get(path);
    if (id === undefined) throw new Error(`not in the site file: ${path.replaceAll('\u0000', '/')}`);
    return id;
  }
}
