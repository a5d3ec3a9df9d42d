import type { Band, Limit, Point, Site } from '../config/site.ts';
import type { Reader } from './lent-connection.ts';
import { matchIds, type WantedId } from './match-ids.ts';
import { key, knownRows, type SiteRow, type SiteTable } from './site-rows.ts';

/**
 * Rows with which a site file would go on if it were put in force: those of the same ids, of former ones, or retired ones
 * that come back. Nothing is written. Null: there is no such row yet.
 */
export interface CarriedIds {
  machine(machineId: string): SiteRow | null;
  point(point: Point): SiteRow | null;
  band(point: Point, band: Pick<Band, 'id'>): SiteRow | null;
  limit(point: Point, limit: Pick<Limit, 'id'>): SiteRow | null;
}

export async function carriedIds(reader: Reader, site: Site): Promise<CarriedIds> {
  const known = await knownRows(reader);
  const children = new Map<string, SiteRow[]>();
  for (const table of ['machines', 'points', 'bands', 'limits'] as const) {
    for (const row of known[table]) {
      const of = `${table} ${row.parent}`;
      const own = children.get(of);
      if (own === undefined) children.set(of, [row]);
      else own.push(row);
    }
  }
  const rows = new Map<string, SiteRow>();
  const match = (
    table: SiteTable,
    parent: string,
    items: readonly WantedId[],
    path: (id: string) => string,
  ) => {
    const parentId = table === 'machines' ? 0 : rows.get(parent)?.id;
    const own = parentId === undefined ? [] : (children.get(`${table} ${parentId}`) ?? []);
    const matched = matchIds(own, items).rows;
    for (const [n, { id }] of items.entries()) {
      const row = own.find((one) => one.id === matched[n]?.id);
      if (row !== undefined) rows.set(path(id), row);
    }
  };
  match('machines', '', site.machines, (id) => key(id));
  for (const { id: machineId, points } of site.machines) {
    match('points', key(machineId), points, (id) => key(machineId, id));
    for (const point of points) {
      match('bands', key(machineId, point.id), point.bands, (id) => bandKey(point, id));
      for (const { id: bandId } of point.bands) {
        const limits = point.limits.filter((limit) => limit.bandId === bandId);
        match('limits', bandKey(point, bandId), limits, (id) => limitKey(point, id));
      }
    }
  }
  return {
    machine: (machineId) => rows.get(key(machineId)) ?? null,
    point: (point) => rows.get(key(point.machineId, point.id)) ?? null,
    band: (point, band) => rows.get(bandKey(point, band.id)) ?? null,
    limit: (point, limit) => rows.get(limitKey(point, limit.id)) ?? null,
  };
}

function bandKey(point: Point, bandId: string): string {
  return key(point.machineId, point.id, 'band', bandId);
}

function limitKey(point: Point, limitId: string): string {
  return key(point.machineId, point.id, 'limit', limitId);
}
