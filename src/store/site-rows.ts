import type { Band, Limit, Machine, Point } from '../config/site.ts';
import type { Reader, Writer } from './lent-connection.ts';
import { type KnownId, matchIds, type WantedId } from './match-ids.ts';

export type SiteTable = 'machines' | 'points' | 'bands' | 'limits';

/** `parent`: machine of a point, point of a band, band of a limit; 0 for machines. */
export interface SiteRow extends KnownId {
  readonly parent: number;
}

/** One pass over the four tables; the tree of new ids grows while it runs. */
export class SiteRows {
  readonly #writer: Writer;
  readonly #wallMs: number;
  readonly #ids = new Map<string, number>();

  constructor(writer: Writer, wallMs: number) {
    this.#writer = writer;
    this.#wallMs = wallMs;
  }

  /** Ids by `key(...)` of what is in the site file. */
  async keep(machines: readonly Machine[]): Promise<ReadonlyMap<string, number>> {
    const known = await knownRows(this.#writer);
    await this.#level(
      'machines',
      known.machines,
      [{ parent: 0, items: machines, path: (m: Machine) => key(m.id) }],
      () => ({}),
    );
    const machineId = (machine: Machine): number => this.#id(key(machine.id));
    await this.#level(
      'points',
      known.points,
      machines.map((machine) => ({
        parent: machineId(machine),
        items: machine.points,
        path: (point: Point) => key(machine.id, point.id),
      })),
      (parent) => ({ machine_id: parent }),
    );
    const points = machines.flatMap((machine) => machine.points);
    const pointId = (point: Point): number => this.#id(key(point.machineId, point.id));
    await this.#level(
      'bands',
      known.bands,
      points.map((point) => ({
        parent: pointId(point),
        items: point.bands,
        path: (band: Band) => key(point.machineId, point.id, 'band', band.id),
      })),
      (parent) => ({ point_id: parent }),
    );
    const perBand = points.flatMap((point) =>
      point.bands.map((band) => ({
        parent: this.#id(key(point.machineId, point.id, 'band', band.id)),
        pointId: pointId(point),
        items: point.limits.filter((limit) => limit.bandId === band.id),
        path: (limit: Limit) => key(point.machineId, point.id, 'limit', limit.id),
      })),
    );
    const pointOfBand = new Map(perBand.map((group) => [group.parent, group.pointId]));
    await this.#level('limits', known.limits, perBand, (parent) => ({
      band_id: parent,
      point_id: pointOfBand.get(parent),
    }));
    return this.#ids;
  }

  #id(path: string): number {
    const id = this.#ids.get(path);
    if (id === undefined) throw new Error(`nothing in the ledger for ${path}`);
    return id;
  }

  /** Matches one level of the tree below each parent, then writes: retire, rename, make new. */
  async #level<Item extends WantedId>(
    table: SiteTable,
    known: readonly SiteRow[],
    groups: readonly { readonly parent: number; readonly items: readonly Item[]; path(item: Item): string }[],
    columns: (parent: number) => object,
  ): Promise<void> {
    const parents = new Set(groups.map((group) => group.parent));
    const vanished = known.filter((row) => row.retiredMs === null && !parents.has(row.parent));
    const matches = groups.map((group) => ({
      group,
      match: matchIds(
        known.filter((row) => row.parent === group.parent),
        group.items,
      ),
    }));
    for (const row of [...vanished, ...matches.flatMap(({ match }) => match.vanished)]) {
      await this.#writer
        .updateTable(table)
        .set({ retired_ms: this.#wallMs })
        .where('id', '=', row.id)
        .execute();
    }
    const renamed = matches.flatMap(({ group, match }) =>
      group.items.flatMap((item, index) => {
        const row = match.rows[index];
        return row && row.idInSite !== item.id ? [row] : [];
      }),
    );
    // A name that is given on in the same edit would clash half-way: renamed rows step aside first.
    for (const row of renamed) {
      await this.#writer
        .updateTable(table)
        .set({ id_in_site: `\u0001renaming ${row.id}` })
        .where('id', '=', row.id)
        .execute();
    }
    for (const { group, match } of matches) {
      for (const [index, item] of group.items.entries()) {
        const row = match.rows[index] ?? null;
        this.#ids.set(group.path(item), await this.#settle(table, row, item.id, columns(group.parent)));
      }
    }
  }

  async #settle(table: SiteTable, row: KnownId | null, idInSite: string, columns: object): Promise<number> {
    if (row === null) {
      const values = { ...columns, id_in_site: idInSite, retired_ms: null };
      // The columns of the parent differ from table to table; `columns` brings those of this one.
      const made = await this.#writer
        .insertInto(table)
        .values(values as never)
        .returning('id')
        .executeTakeFirstOrThrow();
      return made.id;
    }
    if (row.idInSite !== idInSite || row.retiredMs !== null) {
      await this.#writer
        .updateTable(table)
        .set({ id_in_site: idInSite, retired_ms: null })
        .where('id', '=', row.id)
        .execute();
    }
    return row.id;
  }
}

/** All that is or was in the site file, by id. */
export async function knownRows(reader: Reader): Promise<Record<SiteTable, readonly SiteRow[]>> {
  const columns = ['id', 'id_in_site as idInSite', 'retired_ms as retiredMs'] as const;
  const machines = await reader.selectFrom('machines').select(columns).orderBy('id').execute();
  const points = await reader
    .selectFrom('points')
    .select([...columns, 'machine_id as parent'])
    .orderBy('id')
    .execute();
  const bands = await reader
    .selectFrom('bands')
    .select([...columns, 'point_id as parent'])
    .orderBy('id')
    .execute();
  const limits = await reader
    .selectFrom('limits')
    .select([...columns, 'band_id as parent'])
    .orderBy('id')
    .execute();
  return { machines: machines.map((row) => ({ ...row, parent: 0 })), points, bands, limits };
}

/** Ids may hold any character but NUL. */
export function key(...parts: readonly string[]): string {
  return parts.join('\u0000');
}
