import type { BandFacts, MachineFacts, PointFacts, SiteFacts } from '../advisory/facts.ts';
import type { Band, Limit, Machine, Point } from '../config/site.ts';
import { usualDisplayUnit } from '../config/units.ts';
import { type AlarmSubject, subjectKey } from '../detection/alarm.ts';
import { limitSubject } from '../detection/detect.ts';
import type { Series } from '../store/read-trends.ts';
import type { SiteView } from './site-view.ts';

/**
 * Names and limits as messages need them. What a message tells of may have left the site file since: then its ids
 * stand for its names.
 */
export type LimitSubject = Extract<AlarmSubject, { kind: 'limit' }>;

export function siteFacts({ site }: SiteView): SiteFacts {
  return { name: site.name, timeZone: site.timeZone };
}

export function findMachine({ site }: SiteView, id: string): Machine | undefined {
  return site.machines.find((machine) => machine.id === id);
}

export function machineFacts(view: SiteView, id: string): MachineFacts {
  const machine = findMachine(view, id);
  return { id, name: machine?.name ?? id, criticality: machine?.criticality ?? 'B' };
}

export function pointFacts(view: SiteView, machineId: string, id: string): PointFacts {
  const point = view.point(`${machineId}/${id}`);
  return { id, name: point?.name ?? id, direction: point?.direction ?? null };
}

/** Edges as evaluated, where a level has been; else as the site file has them, orders at the nominal speed. */
export function bandFacts(
  id: string,
  band: Band | undefined,
  series: Series | undefined,
  machine: Machine | undefined,
): BandFacts {
  const perOrder = band?.inOrders ? (machine?.runningSpeedHz ?? 1) : 1;
  return {
    id,
    fromHz: series?.fromHz ?? (band?.from ?? 0) * perOrder,
    toHz: series?.toHz ?? (band?.to ?? 0) * perOrder,
    display: band?.display ?? usualDisplayUnit(series?.quantity ?? 'other'),
  };
}

/** What the key of an alarm record that was never stored is about: a limit whose alarm never stood. */
export function limitOfKey(view: SiteView, key: string): LimitSubject {
  for (const point of view.points) {
    for (const limit of point.limits) {
      const subject = limitSubject(point, limit);
      if (subject.kind === 'limit' && subjectKey(subject) === key) return subject;
    }
  }
  const [machineId = '', pointId = '', bandId = '', limitId = ''] = key.replace(/^limit:/, '').split('/');
  return { kind: 'limit', machineId, pointId, bandId, limitId };
}

/** The site's machine behind a ledger's id; undefined where it has left the site file. */
export function machineOfId(view: SiteView, ledgerId: number): Machine | undefined {
  return view.site.machines.find(({ id }) => view.ids.machineId(id) === ledgerId);
}

export function limitOf(point: Point | undefined, limitId: string): Limit | undefined {
  return point?.limits.find(({ id }) => id === limitId);
}
