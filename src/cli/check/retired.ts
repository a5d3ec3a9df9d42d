import { pointPath, type Site } from '../../config/site.ts';
import type { SiteFile } from '../../service/site-in-force.ts';
import { standingAlarms } from '../../store/alarms.ts';
import type { Ledger } from '../../store/ledger.ts';
import { plannedRetirements } from '../../store/site-ids.ts';

/** What the ledger would put to rest when it takes this site file over. */
export interface Retired {
  readonly machines: readonly string[];
  readonly points: readonly string[];
  readonly bands: readonly string[];
  readonly limits: readonly string[];
  /** Alarms and troubles that stand for them and would be closed, by number. */
  readonly alarms: readonly number[];
}

export const nothingRetired: Retired = { machines: [], points: [], bands: [], limits: [], alarms: [] };

/** The ledger must be open for writing: it tries the site file in a transaction that it rolls back. */
export async function retiredBy(ledger: Ledger, { site, text }: SiteFile, wallMs: number): Promise<Retired> {
  const planned = await plannedRetirements(ledger, site, { text, wallMs });
  const gone = new Set([...planned.machines, ...planned.points, ...planned.limits]);
  const lives = await ledger.read((reader) => standingAlarms(reader));
  const alarms = lives.flatMap(({ alarm: { subject }, life }) => {
    if (subject.machineId === null) return [];
    const point =
      subject.pointId === null ? null : pointPath({ machineId: subject.machineId, id: subject.pointId });
    const limit = subject.kind === 'limit' ? `${point}/${subject.limitId}` : null;
    return [subject.machineId, point, limit].some((name) => name !== null && gone.has(name))
      ? [life.number]
      : [];
  });
  return { ...planned, alarms };
}

/** Only the outermost of what goes: with a machine go its points, with a point its bands and limits. */
export function outermost({ machines, points, bands, limits }: Retired): readonly string[] {
  const inside = (path: string) => [...machines, ...points].some((outer) => path.startsWith(`${outer}/`));
  return [
    ...machines.map((path) => `machine ${path}`),
    ...points.filter((path) => !inside(path)).map((path) => `point ${path}`),
    ...bands.filter((path) => !inside(path)).map((path) => `band ${path}`),
    ...limits.filter((path) => !inside(path)).map((path) => `limit ${path}`),
  ];
}

export function recipientsOf({ mail, summary }: Site): readonly string[] {
  return [
    ...new Set(
      [...(mail?.to ?? []), ...(mail === null ? [] : (summary?.to ?? []))].map(({ address }) => address),
    ),
  ];
}
