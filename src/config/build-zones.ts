import { type Build, valueOr } from './layers.ts';
import { type MachineZones, type ZoneChoice, zonesOfMachine } from './machine-zones.ts';
import type { zoneKeys } from './schema-zones.ts';
import type { Written } from './shape.ts';
import type { ReadMap } from './shape-map.ts';
import type { ZoneStandard, ZoneTable } from './zone-tables.ts';

type ZoneKey = keyof typeof zoneKeys;

/** Each group: one of these must stand there, all of them may. */
const neededByStandard: Readonly<Record<ZoneStandard, readonly (readonly ZoneKey[])[]>> = {
  'iso-20816-3': [['power', 'shaft_height'], ['support']],
  'iso-10816-3': [['power', 'shaft_height'], ['support']],
  'iso-10816-7': [['category'], ['power']],
  'iso-10816-1': [['class']],
};

const examples: Readonly<Partial<Record<ZoneKey, string>>> = {
  power: '110 kW',
  support: 'rigid',
  category: 'II',
  class: 'II',
};

/** Null where something is missing, which is told; a machine outside its table has zones that say why. */
export function buildZones(
  build: Build,
  written: Written<ReadMap<typeof zoneKeys>>,
  machine: { readonly id: string; readonly name: string; readonly type: string | null },
): MachineZones | null {
  const { reading } = build;
  const { keys } = written.value;
  if (keys.standard === null) return null;
  const { value: standard, at } = keys.standard;
  if (!hasWhatItTakes(build, written, standard)) return null;
  const choice: ZoneChoice = {
    powerW: valueOr(keys.power, null),
    shaftHeightM: valueOr(keys.shaft_height, null),
    support: valueOr(keys.support, null),
    category: valueOr(keys.category, null),
    class: valueOr(keys.class, null),
  };
  const table = build.zoneTable(standard);
  const zones = zonesOfMachine(table, choice);
  if (zones.outside !== null) reading.warn(at, `machine '${machine.id}' is in no zone: ${zones.outside}`);
  tellPump(build, keys.standard, zones, machine);
  tellTwoGroups(build, written, table, choice, zones);
  return zones;
}

/** False where a key is missing, has no meaning here or was refused. */
function hasWhatItTakes(
  { reading }: Build,
  { value: { keys, has }, at }: Written<ReadMap<typeof zoneKeys>>,
  standard: ZoneStandard,
): boolean {
  const needed = neededByStandard[standard];
  const missing = needed.filter((names) => !names.some((name) => has.has(name)));
  for (const [first, ...others] of missing) {
    const also = others.map((name) => ` or ${name}`).join('');
    const add = `add: ${first}: ${examples[first as ZoneKey]}`;
    reading.problem(keys.standard?.at ?? at, `${standard} needs ${first}${also}`, add, first);
  }
  const known = needed.flat();
  const strange = [...has].filter((name) => name !== 'standard' && !known.includes(name as ZoneKey));
  for (const name of strange) {
    const takes = needed.map((names) => names.join(' or ')).join(', and ');
    const where = keys[name as ZoneKey]?.at ?? at;
    reading.problem(where, `${name} has no meaning in ${standard}`, `it takes ${takes}`);
  }
  const refused = known.some((name) => has.has(name) && keys[name] === null);
  return missing.length + strange.length === 0 && !refused;
}

/** A name proves nothing (the fan of the pump room), so this is a warning. */
function tellPump(
  { reading }: Build,
  standard: Written<ZoneStandard>,
  { pumps, name }: MachineZones,
  machine: { readonly id: string; readonly name: string; readonly type: string | null },
): void {
  const said = [machine.id, machine.name, machine.type ?? ''].find((text) => /pump/i.test(text));
  if (pumps || said === undefined) return;
  reading.warn(
    standard.at,
    `'${said}' is called a pump, and rotodynamic pumps belong to ISO 10816-7, not to ${name}: write standard: iso-10816-7 with category and power if it is one`,
  );
}

function tellTwoGroups(
  { reading }: Build,
  { value: { keys }, at }: Written<ReadMap<typeof zoneKeys>>,
  table: ZoneTable,
  choice: ZoneChoice,
  zones: MachineZones,
): void {
  if (choice.powerW === null || choice.shaftHeightM === null) return;
  const byPower = zonesOfMachine(table, { ...choice, shaftHeightM: null });
  if (byPower.place === zones.place) return;
  const says = (of: MachineZones) => (of.place === '' ? 'no group' : of.place);
  reading.warn(
    keys.shaft_height?.at ?? at,
    `by its power the machine is in ${says(byPower)}, by its shaft height in ${says(zones)}; the shaft height counts, so leave it out unless this is an electrical machine`,
  );
}
