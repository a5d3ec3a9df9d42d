import type { Site } from '../config/site.ts';
import { carryAlarmKeys } from './alarm-keys.ts';
import { type StoredAlarm, standingOfRetired } from './alarms.ts';
import type { Ledger } from './ledger.ts';
import type { Reader, Writer } from './lent-connection.ts';
import { key, knownRows, type SiteRow, SiteRows, type SiteTable } from './site-rows.ts';

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

/** The ids as the ledger has them, for whoever only reads; null where no site file was ever taken over. */
export async function readSiteIds(reader: Reader): Promise<SiteIds | null> {
  const newest = await reader
    .selectFrom('config_versions')
    .select('id')
    .orderBy('id', 'desc')
    .limit(1)
    .executeTakeFirst();
  if (newest === undefined) return null;
  const paths = sitePaths(await knownRows(reader));
  const ids = new Map<string, number>();
  for (const table of ['machines', 'points', 'bands', 'limits'] as const) {
    for (const [id, { path, retired }] of paths[table]) if (!retired) ids.set(path, id);
  }
  return new IdLookup(newest.id, ids);
}

/** What stands behind a surrogate id, also a retired one: the ids that people use, outermost first. */
export interface SiteNames {
  /** [machine] */
  machine(id: number): readonly string[];
  /** [machine, point] */
  point(id: number): readonly string[];
  /** [machine, point, band] */
  band(id: number): readonly string[];
  /** [machine, point, limit] */
  limit(id: number): readonly string[];
}

export async function readSiteNames(reader: Reader): Promise<SiteNames> {
  const paths = sitePaths(await knownRows(reader));
  const names = (table: SiteTable) => (id: number) => {
    const found = paths[table].get(id);
    if (found === undefined) throw new Error(`there is no row ${id} of ${table}`);
    return found.names;
  };
  return { machine: names('machines'), point: names('points'), band: names('bands'), limit: names('limits') };
}

/** What taking this site file over would retire, as `machine`, `machine/point`, `machine/point/band` or `.../limit`. */
export async function plannedRetirements(
  ledger: Ledger,
  site: Site,
  now: { readonly text: string; readonly wallMs: number },
): Promise<Record<SiteTable, readonly string[]>> {
  const planned: Record<SiteTable, readonly string[]> = { machines: [], points: [], bands: [], limits: [] };
  const onlyLooked = new Error('rolled back');
  try {
    await ledger.transact(async (writer) => {
      const before = sitePaths(await knownRows(writer));
      await syncSite(writer, site, now);
      const after = sitePaths(await knownRows(writer));
      for (const table of ['machines', 'points', 'bands', 'limits'] as const) {
        planned[table] = [...before[table]]
          .filter(([id, row]) => !row.retired && after[table].get(id)?.retired === true)
          .map(([, row]) => row.names.join('/'));
      }
      throw onlyLooked;
    });
  } catch (error) {
    if (error !== onlyLooked) throw error;
  }
  return planned;
}

interface SitePath {
  readonly names: readonly string[];
  readonly path: string;
  readonly retired: boolean;
}

function sitePaths(
  rows: Record<SiteTable, readonly SiteRow[]>,
): Record<SiteTable, ReadonlyMap<number, SitePath>> {
  const below = (
    parents: ReadonlyMap<number, SitePath>,
    table: SiteTable,
    names: (parent: SitePath, id: string) => readonly string[],
    path: (names: readonly string[]) => string,
  ) =>
    new Map(
      rows[table].flatMap((row) => {
        const parent = parents.get(row.parent);
        if (parent === undefined) return [];
        const all = names(parent, row.idInSite);
        return [[row.id, { names: all, path: path(all), retired: row.retiredMs !== null }] as const];
      }),
    );
  const top: SitePath = { names: [], path: '', retired: false };
  const inside = (parent: SitePath, id: string) => [...parent.names, id];
  const machines = below(new Map([[0, top]]), 'machines', inside, (names) => key(...names));
  const points = below(machines, 'points', inside, (names) => key(...names));
  const bands = below(points, 'bands', inside, ([machine = '', point = '', band = '']) =>
    key(machine, point, 'band', band),
  );
  const limits = below(
    bands,
    'limits',
    (parent, id) => [...parent.names.slice(0, 2), id],
    ([machine = '', point = '', limit = '']) => key(machine, point, 'limit', limit),
  );
  return { machines, points, bands, limits };
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
