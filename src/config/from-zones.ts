import type { BuiltBands } from './build-bands.ts';
import { type Build, valueOr } from './layers.ts';
import { notOnHousing } from './machine-zones.ts';
import { limitKeys, type WrittenLimit } from './schema-limits.ts';
import type { Span } from './site-text.ts';
import { bandThatWouldDo, type ZoneCase, zonesAtSpeed, zonesOfBand } from './zone-limits.ts';

/**
 * `limits: from zones`: the bands that the table judges. A machine that lies outside its table is refused once; so is a
 * point of vibration without such a band, since it could never alarm.
 */
export function bandsFromZones(
  { reading }: Build,
  at: Span,
  { bands }: BuiltBands,
  {
    shown,
    zoneCase,
    shared,
  }: { readonly shown: string; readonly zoneCase: ZoneCase; readonly shared: boolean },
): readonly string[] {
  const machine = zonesAtSpeed(zoneCase);
  if (!machine.ok) {
    const what = `there are no limits from zones for machine '${zoneCase.machineId}': ${machine.why}`;
    reading.problem(at, what, machine.right, `from zones ${zoneCase.machineId}`);
    return [];
  }
  const judged = bands.filter(({ band }) => zonesOfBand(zoneCase, band).ok);
  if (judged.length > 0) return judged.map(({ band }) => band.id);
  const housing = notOnHousing(zoneCase.point, machine.zones);
  const vibrates = ['acceleration', 'velocity', 'displacement'].includes(zoneCase.point.quantity);
  const why = housing ?? `none of its bands is one: ${bandThatWouldDo(machine.zones, machine.speedHz)}`;
  const what = `${shown} has no limit from zones: ${why}`;
  if (shared && (housing !== null || !vibrates)) reading.warn(at, what, `from zones ${shown}`);
  else
    reading.problem(at, what, 'add such a band, or give the point limits of its own', `from zones ${shown}`);
  return [];
}

/** What `from zones` takes the place of, in the lists further out. */
export function isFixedUpper({ value: { keys } }: WrittenLimit, bandId: string): boolean {
  const { band, kind, side } = keys;
  return band?.value === bandId && valueOr(kind, 'fixed') === 'fixed' && valueOr(side, 'upper') === 'upper';
}

/** As if it had been written: `kind: zone`, with the delays, the action and all else of the limit whose place it takes. */
export function zoneLimit(bandId: string, at: Span, outer: WrittenLimit | null): WrittenLimit {
  const none = Object.fromEntries(Object.keys(limitKeys).map((name) => [name, null]));
  const own = {
    band: { value: bandId, at },
    kind: { value: 'zone', at },
    alert: null,
    danger: null,
    baseline: null,
  };
  const keys = { ...none, ...outer?.value.keys, ...own } as WrittenLimit['value']['keys'];
  const has = new Set(['band', 'kind', ...(outer?.value.has ?? [])]);
  for (const name of ['alert', 'danger', 'baseline']) has.delete(name);
  return { value: { keys, has }, at };
}
