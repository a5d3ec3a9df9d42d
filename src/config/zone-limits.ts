import {
  boundariesFor,
  type MachineZones,
  notOnHousing,
  rangeAt,
  type SensorPlace,
  zonesName,
} from './machine-zones.ts';
import { printFrequency, printLevel } from './print-value.ts';
import type { Band, DisplayUnit, Quantity } from './site.ts';
import type { ZoneBoundaries } from './zone-tables.ts';

/**
 * Where limits stand that come from evaluation zones (ISO 10816-1 and -3, 5.4.1 and 5.4.2). The alert: the baseline
 * of that point + 25 % of B/C, at most 1.25 x B/C. Without a baseline it stands at B/C, from where on long-term
 * running is unsatisfactory, and not at the ceiling, which would leave a stretch of zone C untold. The danger: at C/D,
 * where damage has to be reckoned with. The standard allows a TRIP up to 1.25 x C/D, but TRIP belongs to a protection
 * system; this one is to tell a person, and zone D is when that person must know.
 */

/** A limit's value, SI r.m.s., and in words why it stands there. */
export interface ZoneValue {
  readonly value: number;
  readonly why: string;
}

/** Part of the B/C boundary that makes a change significant, and by which the alert stands above a baseline (5.3, 5.4.1). */
export const significantPart = 0.25;

/**
 * SI r.m.s.; `display` is how the words show levels.
 * Checked: group 2 rigid (B/C 2.8 mm/s), baseline 1 mm/s -> 1.7 mm/s; group 1 rigid (4.5), 4.8 -> 5.625, the ceiling.
 */
export function alertByZone(
  name: string,
  { bc, cd, alarmAtMost }: ZoneBoundaries,
  baseline: number | null,
  display: DisplayUnit,
): ZoneValue {
  const at = printLevel(bc, display);
  if (baseline === null) return { value: bc, why: `B/C of ${name}, as there is no baseline` };
  const said = `baseline ${printLevel(baseline, display)}`;
  const zone = baseline > cd ? 'D' : 'C';
  const doubtful = baseline > bc ? `; that baseline lies in zone ${zone}` : '';
  const value = baseline + significantPart * bc;
  // Levels as people write them come out as they would write the sum: 1.7 and not 1.7000000000000002.
  if (value <= alarmAtMost)
    return {
      value: Number(value.toPrecision(12)),
      why: `${said} + 25 % of B/C (${at}) of ${name}${doubtful}`,
    };
  return {
    value: alarmAtMost,
    why: `ceiling of ${name} over B/C (${at}); ${said} + 25 % would pass it${doubtful}`,
  };
}

export function dangerByZone(name: string, { cd }: ZoneBoundaries): ZoneValue {
  return { value: cd, why: `C/D of ${name}` };
}

/** A point of a machine, as far as its zones need it. */
export interface ZoneCase {
  readonly machineId: string;
  readonly zones: MachineZones | null;
  readonly runningSpeedHz: number | null;
  readonly point: { readonly quantity: Quantity; readonly sensorOn: SensorPlace | null };
}

export type ZonesAnswer =
  | { readonly ok: true; readonly zones: MachineZones; readonly boundaries: ZoneBoundaries }
  | { readonly ok: false; readonly why: string; readonly right: string };

/** The boundaries that hold for a band at the nominal speed; else why there are none, and what to do. */
export function zonesOfBand(of: ZoneCase, band: Band): ZonesAnswer {
  const machine = zonesAtSpeed(of);
  if (!machine.ok) return machine;
  const { zones, speedHz } = machine;
  const housing = notOnHousing(of.point, zones);
  if (housing !== null) return { ok: false, why: housing, right: 'give it limits of kind fixed' };
  if (band.of === 'envelope')
    return {
      ok: false,
      why: `the band is of the envelope, ${zones.name} of the vibration itself`,
      right: 'give it limits of kind fixed',
    };
  const perOrder = band.inOrders ? speedHz : 1;
  const edges = { quantity: band.quantity, fromHz: band.from * perOrder, toHz: band.to * perOrder };
  const answer = boundariesFor(zones, edges, speedHz * 60);
  return answer.ok ? { ...answer, zones } : { ...answer, right: bandThatWouldDo(zones, speedHz) };
}

type AtSpeed =
  | { readonly ok: true; readonly zones: MachineZones; readonly speedHz: number }
  | { readonly ok: false; readonly why: string; readonly right: string };

/** Whether the table holds for the machine at all, whatever its points and bands. */
export function zonesAtSpeed({ zones, runningSpeedHz, machineId }: ZoneCase): AtSpeed {
  const no = (why: string, right: string): AtSpeed => ({ ok: false, why, right });
  if (zones === null)
    return no(
      `machine '${machineId}' has no zones`,
      'add zones: to the machine, with standard, power and support',
    );
  const fixed = 'give alert and danger by limits of kind fixed';
  if (zones.outside !== null) return no(zones.outside, fixed);
  if (runningSpeedHz === null)
    return no(
      `the range of ${zones.name} depends on the running speed, and machine '${machineId}' does not say it`,
      'add to the machine: running_speed: 2970 rpm',
    );
  const best = {
    quantity: zones.boundaries[0]?.quantity ?? 'velocity',
    ...rangeAt(zones, runningSpeedHz * 60),
  };
  const answer = boundariesFor(zones, best, runningSpeedHz * 60);
  return answer.ok ? { ok: true, zones, speedHz: runningSpeedHz } : no(answer.why, fixed);
}

export function bandThatWouldDo(zones: MachineZones, speedHz: number): string {
  const { fromHz, toHz } = rangeAt(zones, speedHz * 60);
  const quantities = zones.boundaries.map(({ quantity }) => quantity).join(' or ');
  return `${zonesName(zones)} judges a band of ${quantities} from ${printFrequency(fromHz)} to ${printFrequency(toHz)}`;
}
