import { tellDoubledBands } from './build-bands.ts';
import { tellDoubledLimits } from './build-limits.ts';
import { buildParts } from './build-parts.ts';
import { type BuiltPoint, buildPoint, type PointSurroundings } from './build-point.ts';
import { buildSpeed } from './build-speed.ts';
import { buildZones } from './build-zones.ts';
import { type Build, type Layers, tellDoubledIds, valueOr, valuesOf } from './layers.ts';
import { nearest } from './nearest.ts';
import { buildConditions } from './operating-conditions.ts';
import type { WrittenSite } from './schema.ts';
import type { machineKeys, machineTypeKeys } from './schema-machines.ts';
import type { Written } from './shape.ts';
import type { ReadMap } from './shape-map.ts';
import type { Machine, RunningRule } from './site.ts';
import type { Span } from './site-text.ts';
import { tellWrongSuppressions } from './suppressed-while.ts';

type WrittenMachine = Written<ReadMap<typeof machineKeys>>;
type WrittenType = Written<ReadMap<typeof machineTypeKeys>>;

export interface BuiltMachine {
  readonly machine: Machine;
  /** Where its pulse channel is written. */
  readonly pulsesAt: Span | null;
  readonly points: readonly BuiltPoint[];
}

/** All machines with their points; those refused are left out, their problems told. */
export function buildMachines(build: Build, site: WrittenSite): readonly BuiltMachine[] {
  const types = site.machine_types === null ? new Map<string, WrittenType>() : site.machine_types.value;
  for (const { value } of types.values()) {
    tellDoubledBands(build, value.keys.bands);
    tellDoubledLimits(build, value.keys.limits);
  }
  const written = site.machines === null ? [] : site.machines.value;
  const ids = written.flatMap(({ value: { keys } }) => {
    if (keys.id === null) return [];
    const { id } = keys;
    return [
      { id: id.value, at: id.at },
      ...(keys.formerly?.value ?? []).map(({ value, at }) => ({ id: value, at })),
    ];
  });
  tellDoubledIds(build.reading, ids, (id, line) => `machine id '${id}' stands twice, first in line ${line}`);
  const used = new Set<string>();
  const known = new Set(ids.map(({ id }) => id));
  const machines = written.flatMap((one) => {
    const { keys } = one.value;
    if (keys.type !== null) used.add(keys.type.value);
    const built = buildMachine(build, one, site, types, known);
    return built === null ? [] : [built];
  });
  for (const [id, { at }] of types) {
    if (!used.has(id))
      build.reading.warn(at, `no machine is of the type '${id}', so its bands and limits are not judged`);
  }
  tellWrongSuppressions(
    build,
    site,
    machines.map(({ machine }) => machine),
  );
  return machines;
}

function buildMachine(
  build: Build,
  written: WrittenMachine,
  site: WrittenSite,
  types: ReadonlyMap<string, WrittenType>,
  known: ReadonlySet<string>,
): BuiltMachine | null {
  const { keys } = written.value;
  tellDoubledBands(build, keys.bands);
  tellDoubledLimits(build, keys.limits);
  if (keys.id === null) return null;
  const id = keys.id.value;
  const type = typeOf(build, keys.type, types);
  if (type === undefined) return null;
  const runningSpeedHz = valueOr(keys.running_speed, null);
  const named = { id, name: valueOr(keys.name, id), type: keys.type?.value ?? null };
  const zones = keys.zones === null ? null : buildZones(build, keys.zones, named);
  const parts = buildParts(build, keys.parts, id, pointIdsOf(keys));
  const bearingShafts = (pointId: string) =>
    parts.flatMap((part) =>
      part.kind === 'rolling-bearing' && part.at.includes(pointId) ? [part.shaft] : [],
    );
  const conditions = buildConditions(build, keys.conditions);
  const around: PointSurroundings = {
    conditions: conditions.map((one) => one.id),
    suppressedWhile: keys.suppressed_while,
    machineId: id,
    bearingShafts,
    runningSpeedHz,
    zones,
    recordings: layersOf(site, type, written, 'recordings') as PointSurroundings['recordings'],
    analysis: layersOf(site, type, written, 'analysis') as PointSurroundings['analysis'],
    bands: [type?.value.keys.bands ?? null, keys.bands],
    limits: [type?.value.keys.limits ?? null, keys.limits],
  };
  tellDoubledPoints(build, keys, id);
  const points = (keys.points?.value ?? []).flatMap((point) => buildPoint(build, point, around) ?? []);
  tellUnknownSisters(build, keys, id, known);
  const machine: Machine = {
    ...named,
    area: valueOr(keys.area, null),
    formerly: valuesOf(keys.formerly),
    runningSpeedHz,
    speed: buildSpeed(build, keys.speed, { id, runningSpeedHz, sidecars: mayHaveSidecars(points) }),
    running: runningRule(build, keys, points),
    afterStartMs: valueOr(keys.after_start, 0),
    stoppedExpectedMs: valueOr(keys.stopped_expected, 7 * 86_400_000),
    criticality: valueOr(keys.criticality, 'B'),
    like: valuesOf(keys.like),
    conditions,
    zones,
    points: points.map(({ point }) => point),
    parts,
  };
  return { machine, pulsesAt: keys.speed?.value.keys.pulse_channel?.at ?? null, points };
}

function mayHaveSidecars(points: readonly BuiltPoint[]): boolean {
  return points.some(({ point }) => point.recordings.sidecar !== 'none');
}

/** Undefined where the type is unknown. */
function typeOf(
  { reading }: Build,
  name: Written<string> | null,
  types: ReadonlyMap<string, WrittenType>,
): WrittenType | null | undefined {
  if (name === null) return null;
  const type = types.get(name.value);
  if (type !== undefined) return type;
  const meant = nearest(name.value, types.keys());
  const all =
    types.size === 0
      ? 'there are no machine_types'
      : `known are ${[...types.keys()].slice(0, 20).join(', ')}`;
  reading.problem(
    name.at,
    `unknown machine type '${name.value}'`,
    meant === null ? all : reading.write(name.at, meant),
  );
  return undefined;
}

function layersOf(
  site: WrittenSite,
  type: WrittenType | null,
  machine: WrittenMachine,
  name: 'recordings' | 'analysis',
): Layers<never> {
  const written = [site[name], type?.value.keys[name] ?? null, machine.value.keys[name]];
  return written.map((one) => (one === null ? null : one.value)) as unknown as Layers<never>;
}

type MachineRead = WrittenMachine['value']['keys'];

/** As written, so that a part of a point whose settings were refused is not told as well. */
function pointIdsOf(keys: MachineRead): string[] {
  return (keys.points?.value ?? []).flatMap(({ value: { keys: point } }) =>
    point.id === null ? [] : [point.id.value],
  );
}

function tellDoubledPoints({ reading }: Build, keys: MachineRead, machineId: string): void {
  const ids = (keys.points?.value ?? []).flatMap(({ value: { keys: point } }) => {
    if (point.id === null) return [];
    const former = (point.formerly?.value ?? []).map(({ value, at }) => ({ id: value, at }));
    return [{ id: point.id.value, at: point.id.at }, ...former];
  });
  const what = (id: string, line: number) =>
    `point id '${id}' stands twice in ${machineId}, first in line ${line}`;
  tellDoubledIds(reading, ids, what);
}

function tellUnknownSisters(
  { reading }: Build,
  keys: MachineRead,
  id: string,
  known: ReadonlySet<string>,
): void {
  for (const { value, at } of keys.like?.value ?? []) {
    if (value === id) reading.problem(at, `machine '${id}' is like itself`, 'name its sister machines');
    else if (!known.has(value)) {
      const meant = nearest(value, known);
      const near = meant === null ? '' : `; the nearest known is ${meant}`;
      reading.warn(at, `machine '${id}' is like '${value}', which is not in this file${near}`);
    }
  }
}

function runningRule(
  { reading }: Build,
  keys: MachineRead,
  points: readonly BuiltPoint[],
): RunningRule | null {
  if (keys.running === null) return null;
  const { value: rule, at } = keys.running;
  if (rule.by !== 'level') return rule;
  const bands = points.flatMap(({ point }) => point.bands.filter(({ id }) => id === rule.bandId));
  if (bands.length < 2) {
    const what = `running by a level needs two points with the band '${rule.bandId}', so that a cut cable is no standing machine; here are ${bands.length}`;
    const all = [...new Set(points.flatMap(({ point }) => point.bands.map(({ id }) => id)))];
    const meant = bands.length === 0 ? nearest(rule.bandId, all) : null;
    reading.problem(
      at,
      what,
      meant === null
        ? 'write: running: speed above 300 rpm, or running: sidecar'
        : `the nearest known band is ${meant}`,
    );
    return null;
  }
  const quantity = rule.above.display.quantity;
  if (bands.some((band) => band.quantity !== quantity)) {
    reading.problem(
      at,
      `the band '${rule.bandId}' is ${bands[0].quantity}, the level is ${quantity}`,
      `give the level in ${bands[0].display.text}`,
    );
    return null;
  }
  return { by: 'level', bandId: rule.bandId, above: rule.above.value };
}
