import type { SisterFacts } from '../advisory/sister-words.ts';
import { type BesideSisters, besideSisters, type MachineDay } from '../assessment/sisters.ts';
import type { Band, Machine, Point } from '../config/site.ts';
import { trendOf } from '../prognosis/trend.ts';
import { machineFacts } from './fact-names.ts';
import type { SiteView } from './site-view.ts';

/** Which bands of a machine leave its sisters: the same band of the same place, in the same operating condition. */

/** The days of a band in one operating condition, of the newest series. */
export interface BandDays {
  readonly bandId: string;
  /** Id of the site file; '' where the machine has one only. */
  readonly condition: string;
  readonly days: readonly MachineDay[];
}

/** A point with the days of all its bands and conditions. */
export interface PointBehind {
  readonly machine: Machine;
  readonly point: Point;
  /** Condition of each band's newest level, by the band's id. */
  readonly conditionNow: ReadonlyMap<string, string>;
  readonly bands: readonly BandDays[];
}

/** A machine is a sister of those that it names, of those that name it, and of their sisters. */
export function sistersOf(machines: readonly Machine[]): Map<string, readonly Machine[]> {
  const group = new Map(machines.map(({ id }) => [id, new Set([id])]));
  for (const { id, like } of machines) {
    for (const other of like) {
      const [mine, theirs] = [group.get(id), group.get(other)];
      if (mine === undefined || theirs === undefined || mine === theirs) continue;
      for (const one of theirs) {
        mine.add(one);
        group.set(one, mine);
      }
    }
  }
  return new Map(
    machines.map(({ id }) => [id, machines.filter((one) => one.id !== id && group.get(id)?.has(one.id))]),
  );
}

/** A day so long ago says nothing of this morning. */
const oldestDays = 2;
/** A dozen tell what is usual; each is held against every other. */
const mostSisters = 12;

/**
 * By point path and band id, bands that leave their sisters or lie apart from them as before. Takes turns with what else
 * the service does.
 *
 * @param today local day of the morning
 */
export async function besideTheirSisters(
  view: SiteView,
  points: readonly PointBehind[],
  today: number,
): Promise<Map<string, SisterFacts>> {
  const sisters = sistersOf(view.site.machines);
  const byMachine = new Map<string, PointBehind[]>();
  for (const one of points) byMachine.set(one.machine.id, [...(byMachine.get(one.machine.id) ?? []), one]);
  const found = new Map<string, SisterFacts>();
  for (const own of points) {
    const machines = sisters.get(own.machine.id) ?? [];
    const others = machines
      .flatMap((machine) => {
        const there = byMachine.get(machine.id)?.find(({ point }) => isSamePlace(point, own.point));
        return there === undefined ? [] : [there];
      })
      .slice(0, mostSisters);
    if (others.length === 0) continue;
    await new Promise<void>((resolve) => setImmediate(resolve));
    for (const band of own.point.bands) {
      const facts = bandBeside(view, own, band, others, today);
      if (facts !== null) found.set(sisterKey(own.machine.id, own.point.id, band.id), facts);
    }
  }
  return found;
}

export function sisterKey(machineId: string, pointId: string, bandId: string): string {
  return `${machineId}/${pointId} ${bandId}`;
}

function bandBeside(
  view: SiteView,
  own: PointBehind,
  band: Band,
  others: readonly PointBehind[],
  today: number,
): SisterFacts | null {
  const condition = own.conditionNow.get(band.id);
  if (condition === undefined) return null;
  const days = daysOf(own, band, condition);
  if ((days.at(-1)?.day ?? Number.NEGATIVE_INFINITY) < today - oldestDays) return null;
  const compared = others.flatMap((other) => {
    const theirs = other.point.bands.find((one) => isSameBand(one, band));
    const of = theirs === undefined ? [] : daysOf(other, theirs, condition);
    return of.length === 0 ? [] : [{ machine: other.machine, days: of }];
  });
  const beside = besideSisters(
    days,
    compared.map((one) => one.days),
  );
  if (beside === null) return null;
  const leaves = hasLeft(beside);
  if (!leaves && !beside.isApart) return null;
  const { ratio, usualRatio } = beside;
  const sisters = compared.map(({ machine }) => machineFacts(view, machine.id));
  return { ratio, usualRatio, sisters, leaves };
}

/** At once, or over the days by a trend of the ratio. */
export function hasLeft(beside: BesideSisters): boolean {
  if (beside.hasMoved || !beside.hasRisen) return beside.hasMoved;
  const days = beside.ratios.map(({ day, level }) => ({ dayMs: day, runningHours: 24 * day, level }));
  return trendOf(days).kind === 'rising';
}

function daysOf({ bands }: PointBehind, band: Band, condition: string): readonly MachineDay[] {
  return bands.find((one) => one.bandId === band.id && one.condition === condition)?.days ?? [];
}

/** The same id, or the same name, which says bearing and direction. */
function isSamePlace(a: Point, b: Point): boolean {
  const named = (point: Point) => point.name.trim().toLowerCase();
  return a.id === b.id || named(a) === named(b);
}

/** The same id and the same edges: levels of other edges are other levels. */
function isSameBand(a: Band, b: Band): boolean {
  return (
    a.id === b.id &&
    a.of === b.of &&
    a.quantity === b.quantity &&
    a.from === b.from &&
    a.to === b.to &&
    a.inOrders === b.inOrders
  );
}
