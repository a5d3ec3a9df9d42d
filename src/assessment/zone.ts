import { boundariesFor, type MachineZones, notOnHousing } from '../config/machine-zones.ts';
import type { Machine, Point, Quantity } from '../config/site.ts';
import { worstZone, type ZoneBoundaries, type ZoneLetter } from '../config/zone-tables.ts';

/**
 * Evaluation zones (ISO 20816-3, ISO 10816-1, -3, -7). A level is in a zone only where the table's conditions hold:
 * r.m.s. velocity or displacement on a bearing housing, over the table's frequency range, in steady running, at a
 * speed and power that the table covers. Where velocity and displacement are both judged the worse counts (ISO 10816-3,
 * 5.2.3), and the machine's zone is the worst of its points. Everything else is 'no zone', with the reason.
 */

/** One recording of a point. */
export interface ZoneReading {
  readonly point: Pick<Point, 'id' | 'quantity' | 'sensorOn'>;
  readonly state: 'running' | 'stopped' | 'transient';
  /** Measured, else nominal; null: not known. */
  readonly speedRpm: number | null;
  readonly levels: readonly ZoneLevel[];
  /** Quality flags of the recording. */
  readonly flags: readonly string[];
}

/** A band level, SI r.m.s., with the edges between which it was measured. */
export interface ZoneLevel {
  readonly bandId: string;
  readonly quantity: Quantity;
  readonly fromHz: number;
  readonly toHz: number;
  readonly level: number;
  readonly atLeast: boolean;
}

export type ZoneAnswer =
  | {
      readonly letter: ZoneLetter;
      /** Clipped or saturated: it is this zone or a worse one. */
      readonly atLeast: boolean;
      readonly level: number;
      readonly boundaries: ZoneBoundaries;
    }
  | { readonly letter: null; readonly why: string };

export interface PointZone {
  readonly pointId: string;
  readonly zone: ZoneAnswer;
  readonly bands: ReadonlyMap<string, ZoneAnswer>;
}

export interface MachineZone {
  readonly zone: ZoneAnswer;
  /** The point that is in it; null: no zone. */
  readonly pointId: string | null;
  readonly points: readonly PointZone[];
}

/**
 * Zone of each band, of each point, and of the machine. A machine without zones in the site file answers no zone.
 *
 * @param readings the newest usable recording of each point, in the order in which points are to be named
 */
export function machineZone(machine: Pick<Machine, 'zones'>, readings: readonly ZoneReading[]): MachineZone {
  const { zones = null } = machine;
  if (zones === null)
    return { zone: no('the site file names no zones for this machine'), pointId: null, points: [] };
  const points = readings.map((reading) => pointZone(zones, reading));
  const worst = worstOf(points.map(({ zone }) => zone));
  const zone = worst ?? points[0]?.zone ?? no('there is no recording');
  const pointId = worst === null ? null : (points.find((point) => point.zone === worst)?.pointId ?? null);
  return { zone, pointId, points };
}

export function pointZone(zones: MachineZones, reading: ZoneReading): PointZone {
  const bands = new Map(reading.levels.map((level) => [level.bandId, bandZone(zones, reading, level)]));
  const judged = reading.levels.filter(({ quantity }) => isJudged(zones, quantity));
  const first = judged[0] === undefined ? undefined : bands.get(judged[0].bandId);
  const zone = worstOf([...bands.values()]) ?? first ?? no(`there is no level of what ${zones.name} judges`);
  return { pointId: reading.point.id, zone, bands };
}

/** Whether the table judges this quantity at all, whatever else stands against it. */
export function isJudged({ boundaries, outside }: MachineZones, quantity: Quantity): boolean {
  return outside === null
    ? boundaries.some((one) => one.quantity === quantity)
    : quantity === 'velocity' || quantity === 'displacement';
}

export function bandZone(
  zones: MachineZones,
  reading: Omit<ZoneReading, 'levels'>,
  level: ZoneLevel,
): ZoneAnswer {
  if (zones.outside !== null) return no(zones.outside);
  const housing = notOnHousing(reading.point, zones);
  if (housing !== null) return no(housing);
  const answer = boundariesFor(zones, level, reading.speedRpm);
  if (!answer.ok) return no(answer.why);
  const unsteady = notSteady(reading);
  if (unsteady !== null) return no(unsteady);
  if (!Number.isFinite(level.level)) return no('there is no level');
  const { boundaries } = answer;
  const letter = letterOf(level.level, boundaries);
  return { letter, atLeast: level.atLeast && letter !== 'D', level: level.level, boundaries };
}

/** Flags of a recording whose levels may be the sensor's or the cable's own. */
const spoilt = ['flat', 'dropouts', 'hum-only', 'low-signal', 'bias-out-of-range', 'ski-slope'];

function notSteady({ state, flags }: Pick<ZoneReading, 'state' | 'flags'>): string | null {
  if (state === 'stopped' || flags.includes('not-running')) return 'the machine stood still';
  if (state === 'transient' || flags.includes('transient'))
    return 'the machine had been started a short while before';
  if (flags.includes('unsteady')) return 'the vibration changed within the recording';
  const flag = spoilt.find((one) => flags.includes(one));
  return flag === undefined ? null : `the recording is flagged ${flag}`;
}

/**
 * The zone of a level, SI r.m.s. A level exactly on a boundary is in the better zone, as a level exactly at its limit
 * is no alarm; the standards leave that open. Checked: 2.8 mm/s, group 2 rigid: B; 2.81: C.
 */
export function letterOf(
  level: number,
  { ab, bc, cd }: Pick<ZoneBoundaries, 'ab' | 'bc' | 'cd'>,
): ZoneLetter {
  if (level <= ab) return 'A';
  if (level <= bc) return 'B';
  return level <= cd ? 'C' : 'D';
}

/** The first of the worst; null where none is in a zone. */
function worstOf(zones: readonly ZoneAnswer[]): (ZoneAnswer & { readonly letter: ZoneLetter }) | null {
  const inZone = zones.filter((zone) => zone.letter !== null);
  const worst = worstZone(inZone.map(({ letter }) => letter));
  const those = inZone.filter(({ letter }) => letter === worst);
  return those.find(({ atLeast }) => atLeast) ?? those[0] ?? null;
}

function no(why: string): ZoneAnswer {
  return { letter: null, why };
}
