/** A row of the ledger that stands, or once stood, for something in the site file. */
export interface KnownId {
  readonly id: number;
  readonly idInSite: string;
  readonly retiredMs: number | null;
}

export interface WantedId {
  readonly id: string;
  readonly formerly: readonly string[];
}

export interface IdMatch {
  /** Row for each wanted item, in their order; null where a new row is to be made. */
  readonly rows: readonly (KnownId | null)[];
  /** Rows in use that nothing in the site file stands for any more. */
  readonly vanished: readonly KnownId[];
}

/**
 * Which row each item of the site file goes on with, among the rows of one parent. Pure. In order of preference: the row
 * in use under its own id; a row in use under an id it had formerly; a retired row under its own id, then under a
 * former one (the newest). An item that has no row in use under its own id takes a former one even from an item that
 * bears that id now, so a name can be given on in the same edit; once it has its own row, `formerly` does nothing, so
 * reading the same site file again changes nothing.
 */
export function matchIds(known: readonly KnownId[], wanted: readonly WantedId[]): IdMatch {
  const inUse = new Map(known.filter((row) => row.retiredMs === null).map((row) => [row.idInSite, row]));
  const taken = new Map<number, number>();
  const rows: (KnownId | null)[] = wanted.map((item, index) => {
    const own = inUse.get(item.id) ?? null;
    if (own !== null) taken.set(own.id, index);
    return own;
  });
  const newcomers = rows.flatMap((row, index) => (row === null ? [index] : []));
  const renamed = new Set<number>();
  for (let index = newcomers.shift(); index !== undefined; index = newcomers.shift()) {
    const former = wanted[index]?.formerly
      .map((name) => inUse.get(name))
      .find((row) => row !== undefined && !renamed.has(row.id));
    if (former === undefined) continue;
    const displaced = taken.get(former.id);
    if (displaced !== undefined) {
      rows[displaced] = null;
      newcomers.push(displaced);
    }
    rows[index] = former;
    renamed.add(former.id);
    taken.set(former.id, index);
  }
  takeRetired(known, wanted, rows);
  const used = new Set(rows.map((row) => row?.id));
  return { rows, vanished: [...inUse.values()].filter((row) => !used.has(row.id)) };
}

function takeRetired(known: readonly KnownId[], wanted: readonly WantedId[], rows: (KnownId | null)[]): void {
  const retired = known
    .filter((row) => row.retiredMs !== null)
    .sort((a, b) => (b.retiredMs ?? 0) - (a.retiredMs ?? 0) || b.id - a.id);
  const used = new Set<number>();
  const take = (index: number, name: string): boolean => {
    const row = retired.find((candidate) => candidate.idInSite === name && !used.has(candidate.id));
    if (row === undefined) return false;
    used.add(row.id);
    rows[index] = row;
    return true;
  };
  wanted.forEach((item, index) => {
    if (rows[index] === null) take(index, item.id);
  });
  wanted.forEach((item, index) => {
    if (rows[index] === null) item.formerly.some((name) => take(index, name));
  });
}
