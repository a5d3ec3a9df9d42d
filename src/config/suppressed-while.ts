import type { Build } from './layers.ts';
import { nearest } from './nearest.ts';
import { type Parsed, refused, shorten, understood } from './quantity.ts';
import type { WrittenSite } from './schema.ts';
import { list, scalar, type Written } from './shape.ts';
import { key } from './shape-map.ts';
import type { Machine } from './site.ts';

/**
 * `suppressed_while:` on a machine, a point or a limit: suppression by design (ANSI/ISA-18.2-2016, state H). It holds
 * back the alarms of limits while another point gives no usable data, or while a machine stands, runs or starts.
 * Troubles are never held back by it: whatever blinds the reference is told.
 */
export type SuppressedWhile =
  /** Any trouble of that point stands; point null: of any point of that machine. */
  | { readonly by: 'trouble'; readonly machineId: string; readonly pointId: string | null }
  | { readonly by: 'machine'; readonly machineId: string; readonly state: SuppressingState };

export const suppressingStates = ['stopped', 'transient', 'running'] as const;
export type SuppressingState = (typeof suppressingStates)[number];

const example = 'trouble of pump-2/de-v';

/** `trouble of MACHINE/POINT`, `trouble of MACHINE`, `MACHINE stopped`, `MACHINE transient`, `MACHINE running`. */
export function parseSuppressedWhile(text: string): Parsed<SuppressedWhile> {
  const written = text.trim().replace(/\s+/g, ' ');
  const trouble = /^trouble (?:of|at) ([^\s/]+)(?:\/([^\s/]+))?$/i.exec(written);
  if (trouble !== null) {
    const [, machineId = '', pointId = null] = trouble;
    return understood({ by: 'trouble', machineId, pointId });
  }
  const machine = /^([^\s/]+) (?:is )?(\S+)$/.exec(written);
  if (machine !== null) {
    const [, machineId = '', word = ''] = machine;
    const state = suppressingStates.find((one) => one === word);
    if (state !== undefined) return understood({ by: 'machine', machineId, state });
    const meant = nearest(word, suppressingStates);
    const what = `'${shorten(word)}' is none of ${suppressingStates.join(', ')}`;
    return refused(what, meant === null ? null : `${machineId} ${meant}`);
  }
  return refused(
    `'${shorten(text)}' is none of '${example}', 'pump-2 stopped', 'pump-2 transient', 'pump-2 running'`,
    /^[^\s/]+\/[^\s/]+$/.test(written) ? `trouble of ${written}` : null,
  );
}

/** As it is written, for the journal and for people. */
export function suppressedWhileText(one: SuppressedWhile): string {
  if (one.by === 'machine') return `${one.machineId} ${one.state}`;
  return `trouble of ${one.machineId}${one.pointId === null ? '' : `/${one.pointId}`}`;
}

export const suppressedWhileKey = key(
  list(scalar(parseSuppressedWhile, { example, free: true }), 50),
  "Alarms of limits are held back while one of these holds: 'trouble of pump-2/de-v', 'pump-2 stopped', 'pump-2 transient', 'pump-2 running'. Troubles are told always.",
  { fallback: 'never' },
);

export type WrittenSuppressions = Written<readonly Written<SuppressedWhile>[]> | null;

/** Limit, point and machine added up, without what would let a point's own trouble, or its running, hide its levels. */
export function suppressionsOf(
  place: string,
  ...layers: readonly WrittenSuppressions[]
): readonly SuppressedWhile[] {
  const all = layers.flatMap((layer) => (layer?.value ?? []).map(({ value }) => value));
  const texts = all.map(suppressedWhileText);
  return all.filter((one, n) => !hidesOwn(one, place) && texts.indexOf(texts[n]) === n);
}

/** `place`: 'pump-2/de-v'; of a machine with all its points, 'pump-2/'. */
function hidesOwn(one: SuppressedWhile, place: string): boolean {
  const isOwnMachine = place.startsWith(`${one.machineId}/`);
  if (one.by === 'machine') return isOwnMachine && one.state === 'running';
  return one.pointId === null ? isOwnMachine : place === `${one.machineId}/${one.pointId}`;
}

/** Names that are not in the site file, and conditions that could never hold. */
export function tellWrongSuppressions(
  { reading }: Build,
  site: WrittenSite,
  machines: readonly Machine[],
): void {
  const known = knownMachines(site, machines);
  const check = (layer: WrittenSuppressions, own: string | null) => {
    for (const { value, at } of layer?.value ?? []) {
      const wrong = wrongReference(value, known, own);
      if (wrong === null) continue;
      const { what, meant, right } = wrong;
      reading.problem(at, what, meant === null ? right : reading.write(at, meant));
    }
  };
  for (const { value } of site.machine_types?.value.values() ?? [])
    for (const limit of value.keys.limits?.value.list ?? []) check(limit.value.keys.suppressed_while, null);
  for (const { value: machine } of site.machines?.value ?? []) {
    const ownMachine = `${machine.keys.id?.value}/`;
    check(machine.keys.suppressed_while, ownMachine);
    for (const limit of machine.keys.limits?.value.list ?? [])
      check(limit.value.keys.suppressed_while, ownMachine);
    for (const { value: point } of machine.keys.points?.value ?? []) {
      const own = `${ownMachine}${point.keys.id?.value}`;
      check(point.keys.suppressed_while, own);
      for (const limit of point.keys.limits?.value.list ?? []) check(limit.value.keys.suppressed_while, own);
    }
  }
}

interface KnownMachine {
  readonly id: string;
  readonly pointIds: readonly string[];
  /** Null where it was refused for another reason, which is told. */
  readonly machine: Machine | null;
}

/** As written, so that a condition on what was refused is not told as well. */
function knownMachines(site: WrittenSite, machines: readonly Machine[]): KnownMachine[] {
  return (site.machines?.value ?? []).flatMap(({ value: { keys } }) => {
    if (keys.id === null) return [];
    const id = keys.id.value;
    const pointIds = (keys.points?.value ?? []).flatMap(({ value }) => value.keys.id?.value ?? []);
    return [{ id, pointIds, machine: machines.find((one) => one.id === id) ?? null }];
  });
}

interface WrongReference {
  readonly what: string;
  /** The whole condition, as it was most likely meant. */
  readonly meant: string | null;
  readonly right: string;
}

function wrongReference(
  one: SuppressedWhile,
  known: readonly KnownMachine[],
  own: string | null,
): WrongReference | null {
  const of = known.find(({ id }) => id === one.machineId);
  if (of === undefined) {
    const ids = known.map(({ id }) => id);
    const near = nearest(one.machineId, ids);
    return {
      what: `suppressed_while names machine '${one.machineId}', which is not in this file`,
      meant: near === null ? null : suppressedWhileText({ ...one, machineId: near }),
      right: `known are ${ids.slice(0, 20).join(', ')}`,
    };
  }
  if (own !== null && hidesOwn(one, own)) return ownReference(one, own);
  if (one.by === 'machine') return of.machine === null ? null : neverChanges(one.state, of.machine);
  if (one.pointId !== null && !of.pointIds.includes(one.pointId)) {
    const near = nearest(one.pointId, of.pointIds);
    return {
      what: `suppressed_while names point '${one.pointId}', which ${of.id} has not`,
      meant: near === null ? null : suppressedWhileText({ ...one, pointId: near }),
      right: `its points are ${of.pointIds.slice(0, 20).join(', ')}`,
    };
  }
  return null;
}

function ownReference(one: SuppressedWhile, own: string): WrongReference {
  const what =
    one.by === 'machine'
      ? `limits of ${one.machineId} are judged while it runs: held back then, they could never alarm`
      : one.pointId === null
        ? `the trouble of ${one.machineId} is that of its own points: what is wrong with a point never hides its levels`
        : `the trouble of ${own} is its own: what is wrong with a point never hides its levels`;
  const another = one.by === 'machine' ? 'machine' : 'point';
  return { what, meant: null, right: `name another ${another}, or leave it out` };
}

function neverChanges(state: SuppressingState, machine: Machine): WrongReference | null {
  const { id, running, afterStartMs } = machine;
  if (running === null)
    return {
      what: `${id} has no running:, so it ${state === 'running' ? 'always counts as running' : `never counts as ${state}`}`,
      meant: null,
      right: `add to ${id}: running: speed above 300 rpm`,
    };
  if (state === 'transient' && afterStartMs === 0)
    return {
      what: `${id} has no after_start:, so it never counts as transient`,
      meant: null,
      right: `add to ${id}: after_start: 10 min`,
    };
  return null;
}
