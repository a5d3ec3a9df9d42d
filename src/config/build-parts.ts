import { judgeBearing } from './bearing-check.ts';
import { type Build, tellDoubledIds, valueOr } from './layers.ts';
import { nearest } from './nearest.ts';
import type { BearingGeometry, BearingMultiples, Part, PartKind, PartPlace } from './parts.ts';
import { keysOfKind, partKeys } from './schema-parts.ts';
import type { Written } from './shape.ts';
import type { ReadMap } from './shape-map.ts';

type WrittenPart = Written<ReadMap<typeof partKeys>>;
type PartRead = WrittenPart['value']['keys'];
type KeyName = keyof typeof partKeys;

/** The parts of a machine; one that was refused is left out, its problem told. `pointIds`: of the machine. */
export function buildParts(
  build: Build,
  written: Written<readonly WrittenPart[]> | null,
  machineId: string,
  pointIds: readonly string[],
): readonly Part[] {
  if (written === null) return [];
  const ids = written.value.flatMap(({ value: { keys } }) =>
    keys.id === null ? [] : [{ id: keys.id.value, at: keys.id.at }],
  );
  tellDoubledIds(
    build.reading,
    ids,
    (id, line) => `part id '${id}' stands twice in ${machineId}, first in line ${line}`,
  );
  return written.value.flatMap((one) => buildPart(build, one, machineId, pointIds) ?? []);
}

function buildPart(
  build: Build,
  part: WrittenPart,
  machineId: string,
  pointIds: readonly string[],
): Part | null {
  const { keys } = part.value;
  if (keys.id === null || keys.kind === null) return null;
  const kind = keys.kind.value;
  if (!takesItsKeys(build, part, kind)) return null;
  const at = keys.at?.value ?? [];
  for (const point of at) tellUnknownPoint(build, point, machineId, pointIds);
  const place: PartPlace = {
    id: keys.id.value,
    name: valueOr(keys.name, keys.id.value),
    at: keys.at === null ? pointIds : at.map(({ value }) => value),
    shaft: valueOr(keys.shaft, 1),
  };
  return builders[kind](build, part, place);
}

function takesItsKeys(
  { reading }: Build,
  { value: { keys, has }, at }: WrittenPart,
  kind: PartKind,
): boolean {
  const { needs, takes } = keysOfKind[kind];
  const usual: readonly KeyName[] = ['id', 'kind', 'name', 'at', 'shaft'];
  let sound = true;
  for (const name of has as ReadonlySet<KeyName>) {
    if (usual.includes(name) || needs.includes(name) || takes.includes(name)) continue;
    const known = [...needs, ...takes];
    const right = known.length === 0 ? 'remove it' : `it takes ${known.join(', ')}`;
    reading.problem(keys[name]?.at ?? at, `${name} has no meaning in a part of the kind ${kind}`, right);
    sound = false;
  }
  for (const name of needs) {
    if (has.has(name)) {
      if (keys[name] === null) sound = false;
      continue;
    }
    tellMissing(reading, keys, name, kind);
    sound = false;
  }
  return sound;
}

function tellMissing(reading: Build['reading'], keys: PartRead, name: KeyName, kind: string): void {
  const at = keys.kind?.at ?? { from: 0, to: 0 };
  reading.problem(at, `a part of the kind ${kind} needs ${name}`, `add: ${name}: ${example(name)}`, name);
}

function example(name: KeyName): string {
  return partKeys[name].shape.example;
}

function tellUnknownPoint(
  { reading }: Build,
  { value, at }: Written<string>,
  machineId: string,
  pointIds: readonly string[],
): void {
  if (pointIds.includes(value)) return;
  const meant = nearest(value, pointIds);
  const right =
    meant === null ? `its points are ${pointIds.slice(0, 20).join(', ')}` : reading.write(at, meant);
  reading.problem(at, `${machineId} has no point '${value}'`, right);
}

type Builder = (build: Build, part: WrittenPart, place: PartPlace) => Part | null;

const builders: Readonly<Record<PartKind, Builder>> = {
  'rolling-bearing': rollingBearing,
  'gear-pair': (_build, { value: { keys } }, place) => ({
    ...place,
    kind: 'gear-pair',
    teeth: valueOr(keys.teeth, 0),
    matingTeeth: valueOr(keys.mating_teeth, 0),
  }),
  'planetary-gear': planetaryGear,
  vanes: (_build, { value: { keys } }, place) => ({ ...place, kind: 'vanes', count: valueOr(keys.count, 0) }),
  blades: (_build, { value: { keys } }, place) => ({
    ...place,
    kind: 'blades',
    count: valueOr(keys.count, 0),
  }),
  belt,
  'electric-motor': (_build, { value: { keys } }, place) => ({
    ...place,
    kind: 'electric-motor',
    lineHz: valueOr(keys.line_frequency, 0),
    poles: valueOr(keys.poles, 0),
    rotorBars: valueOr(keys.rotor_bars, null),
  }),
  coupling: (_build, { value: { keys } }, place) => ({
    ...place,
    kind: 'coupling',
    elements: valueOr(keys.elements, null),
  }),
};

function rollingBearing(build: Build, part: WrittenPart, place: PartPlace): Part | null {
  const { keys, has } = part.value;
  const multiples: BearingMultiples = {
    ftf: valueOr(keys.ftf, null),
    bsf: valueOr(keys.bsf, null),
    bpfo: valueOr(keys.bpfo, null),
    bpfi: valueOr(keys.bpfi, null),
  };
  const sizes = ['rolling_elements', 'element_diameter', 'pitch_diameter'] as const;
  const given = sizes.filter((name) => has.has(name));
  const byMultiples = (['ftf', 'bsf', 'bpfo', 'bpfi'] as const).some((name) => has.has(name));
  if (given.length === 0 && !byMultiples) {
    const right = `add ${sizes.join(', ')} and contact_angle, or the maker's multiples such as bpfo: 3.585x`;
    build.reading.problem(
      keys.kind?.at ?? part.at,
      'a rolling-bearing needs its geometry or its multiples',
      right,
    );
    return null;
  }
  for (const name of given.length === 0 ? [] : sizes) {
    if (!has.has(name)) tellMissing(build.reading, keys, name, 'rolling-bearing with a geometry');
  }
  const geometry = given.length === 0 ? null : geometryOf(build, keys);
  if (geometry === null && given.length > 0) return null;
  const turningRing = valueOr(keys.turning_ring, 'inner');
  const wrong = judgeBearing(multiples, geometry, turningRing);
  if (wrong !== null) {
    build.reading.problem(keys[wrong.key]?.at ?? part.at, wrong.what, wrong.right);
    return null;
  }
  return {
    ...place,
    kind: 'rolling-bearing',
    geometry,
    multiples,
    turningRing,
  };
}

function geometryOf({ reading }: Build, keys: PartRead): BearingGeometry | null {
  const { rolling_elements, element_diameter, pitch_diameter } = keys;
  if (rolling_elements === null || element_diameter === null || pitch_diameter === null) return null;
  const rollingElements = rolling_elements.value;
  const elementDiameter = element_diameter.value;
  const pitchDiameter = pitch_diameter.value;
  if (elementDiameter >= pitchDiameter) {
    const right = 'give the diameter of a ball or roller, and of the circle through their centres';
    reading.problem(element_diameter.at, 'the element is as large as the circle that it runs on', right);
    return null;
  }
  // Elements side by side on the pitch circle: their chords may touch and not overlap.
  const most = Math.floor(Math.PI / Math.asin(elementDiameter / pitchDiameter) + 1e-3);
  if (rollingElements > most) {
    const what = `${rollingElements} elements of this diameter do not fit on this pitch circle, ${most} do`;
    reading.problem(rolling_elements.at, what, 'count the elements of one row, and measure in one unit');
    return null;
  }
  return { rollingElements, elementDiameter, pitchDiameter, contactAngleDeg: valueOr(keys.contact_angle, 0) };
}

function planetaryGear(build: Build, { value: { keys }, at }: WrittenPart, place: PartPlace): Part | null {
  const sunTeeth = valueOr(keys.sun_teeth, 0);
  const planetTeeth = valueOr(keys.planet_teeth, 0);
  const ringTeeth = valueOr(keys.ring_teeth, 0);
  const held = valueOr(keys.held, 'ring');
  const onShaft = valueOr(keys.on_shaft, 'sun');
  // Profile shift allows a tooth or two; more is a slip of the pen.
  if (Math.abs(ringTeeth - sunTeeth - 2 * planetTeeth) > 4) {
    const what = `a ring of ${ringTeeth} teeth does not close around a sun of ${sunTeeth} and planets of ${planetTeeth}`;
    const right = `ring = sun + twice planet, ${sunTeeth + 2 * planetTeeth} here`;
    build.reading.problem(keys.ring_teeth?.at ?? at, what, right);
    return null;
  }
  if (held === onShaft) {
    const right = 'name the member that turns with the shaft';
    build.reading.problem(
      (keys.on_shaft ?? keys.held)?.at ?? at,
      `the ${held} is held and cannot turn`,
      right,
    );
    return null;
  }
  const planets = valueOr(keys.planets, 0);
  return { ...place, kind: 'planetary-gear', sunTeeth, planetTeeth, ringTeeth, planets, held, onShaft };
}

function belt(build: Build, { value: { keys }, at }: WrittenPart, place: PartPlace): Part | null {
  const pulleyDiameter = valueOr(keys.pulley_diameter, 0);
  const other = valueOr(keys.other_pulley_diameter, null);
  const distance = valueOr(keys.centre_distance, null);
  const given = valueOr(keys.belt_length, null);
  if (given === null && other === null) {
    const right = 'add belt_length, or other_pulley_diameter and centre_distance';
    build.reading.problem(keys.kind?.at ?? at, 'a belt needs its length or its other pulley', right);
    return null;
  }
  if (given !== null && given <= (Math.PI / 2) * (pulleyDiameter + (other ?? 0))) {
    const right = 'give the length of the whole belt';
    build.reading.problem(keys.belt_length?.at ?? at, 'the belt does not reach around its pulleys', right);
    return null;
  }
  if (distance !== null && other !== null && distance < (pulleyDiameter + other) / 2) {
    const right = 'give the distance from shaft to shaft';
    build.reading.problem(keys.centre_distance?.at ?? at, 'the two pulleys overlap', right);
    return null;
  }
  // Open belt, to second order of the difference of the diameters: under 0.1 % from half their sum on.
  const length =
    given ??
    (other === null || distance === null
      ? null
      : 2 * distance +
        (Math.PI / 2) * (pulleyDiameter + other) +
        (other - pulleyDiameter) ** 2 / (4 * distance));
  return { ...place, kind: 'belt', pulleyDiameter, length, otherPulleyDiameter: other };
}
