import type { BuiltBand, BuiltBands, ListLayers } from './build-bands.ts';
import { type Build, tellDoubledIds, valueOr, valuesOf } from './layers.ts';
import { parseLevel } from './level.ts';
import { nearest } from './nearest.ts';
import { printLevel } from './print-value.ts';
import type { limitKeys } from './schema-machines.ts';
import type { Written } from './shape.ts';
import type { ReadMap } from './shape-map.ts';
import type { Limit, LimitKind } from './site.ts';
import { asYaml } from './site-text.ts';

export type WrittenLimit = Written<ReadMap<typeof limitKeys>>;

/** What a kind of limit adds to the keys that all kinds share; null where it was refused. */
type KindParts = Pick<Limit, 'alert' | 'danger'>;

/** One entry a kind. */
const kinds: Readonly<
  Record<LimitKind, (build: Build, written: WrittenLimit, band: BuiltBand) => KindParts | null>
> = {
  fixed: fixedValues,
};

/** The limits of one point: a limit of an inner list replaces the outer one of the same id. */
export function buildLimits(
  build: Build,
  layers: ListLayers<WrittenLimit>,
  bands: BuiltBands,
  shown: string,
): readonly Limit[] {
  const chosen = new Map<string, { readonly written: WrittenLimit; readonly layer: number }>();
  layers.forEach((list, layer) => {
    for (const written of list?.value ?? []) {
      const id = limitId(written);
      if (id !== null && chosen.get(id)?.layer !== layer) chosen.set(id, { written, layer });
    }
  });
  const limits: Limit[] = [];
  for (const [id, { written }] of chosen) {
    const limit = buildLimit(build, id, written, bands, shown);
    if (limit !== null) limits.push(limit);
  }
  return limits;
}

export function tellDoubledLimits({ reading }: Build, list: Written<readonly WrittenLimit[]> | null): void {
  const ids = (list?.value ?? []).flatMap((written) => {
    const id = limitId(written);
    const at = written.value.keys.id?.at ?? written.at;
    return id === null ? [] : [{ id, at }];
  });
  const what = (id: string, line: number) => `limit '${id}' stands twice, first in line ${line}`;
  tellDoubledIds(reading, ids, what);
}

function limitId({ value: { keys, has } }: WrittenLimit): string | null {
  if (has.has('id')) return keys.id?.value ?? null;
  if (keys.band === null) return null;
  return `${keys.band.value}-${valueOr(keys.kind, 'fixed')}-${valueOr(keys.side, 'upper')}`;
}

function buildLimit(
  build: Build,
  id: string,
  written: WrittenLimit,
  { bands, absent }: BuiltBands,
  shown: string,
): Limit | null {
  const { keys } = written.value;
  if (keys.band === null) return null;
  const bandId = keys.band.value;
  const band = bands.find((one) => one.band.id === bandId);
  if (band === undefined) {
    if (!absent.has(bandId)) tellUnknownBand(build, keys.band, bands, shown);
    return null;
  }
  const kind = valueOr(keys.kind, 'fixed');
  const parts = kinds[kind](build, written, band);
  if (parts === null) return null;
  return {
    id,
    formerly: valuesOf(keys.formerly),
    bandId,
    kind,
    side: valueOr(keys.side, 'upper'),
    ...parts,
    onDelay: valueOr(keys.on_delay, { recordings: 2 }),
    offDelay: valueOr(keys.off_delay, { recordings: 1 }),
    deadbandPercent: valueOr(keys.deadband, 10),
    latching: valueOr(keys.latching, false),
    sayAgainPercent: keys.say_again_at === null ? 25 : keys.say_again_at.value,
    action: keys.action === null ? null : keys.action.value,
    respondWithinMs: keys.respond_within === null ? null : keys.respond_within.value,
  };
}

function tellUnknownBand(
  { reading }: Build,
  written: Written<string>,
  bands: readonly BuiltBand[],
  shown: string,
): void {
  const known = bands.map(({ band }) => band.id);
  const meant = nearest(written.value, known);
  const what = `${shown} has no band '${written.value}'`;
  const all =
    known.length === 0
      ? 'it has no bands; add some under bands:'
      : `its bands are ${known.slice(0, 20).join(', ')}`;
  reading.problem(written.at, what, meant === null ? all : reading.write(written.at, meant), 'unknown band');
}

function fixedValues(build: Build, written: WrittenLimit, band: BuiltBand): KindParts | null {
  const { reading } = build;
  const { keys, has } = written.value;
  if (!has.has('alert') && !has.has('danger')) {
    const example = printLevel(band.band.display.inSi, band.band.display);
    reading.problem(
      written.at,
      'the limit has neither alert nor danger',
      `add: alert: ${example}`,
      'no value',
    );
    return null;
  }
  const alert = levelOf(build, 'alert', keys.alert, band);
  const danger = levelOf(build, 'danger', keys.danger, band);
  if ((keys.alert !== null && alert === null) || (keys.danger !== null && danger === null)) return null;
  const side = valueOr(keys.side, 'upper');
  if (alert !== null && danger !== null && keys.alert !== null && keys.danger !== null) {
    const wrong = side === 'upper' ? alert >= danger : alert <= danger;
    if (wrong) {
      const relation = side === 'upper' ? 'not below' : 'not above';
      const what = `alert ${keys.alert.value} is ${relation} danger ${keys.danger.value}`;
      const swapped = reading.write(keys.alert.at, asYaml(keys.danger.value));
      const right =
        alert === danger ? 'give them different values' : `${swapped} and danger: ${keys.alert.value}`;
      reading.problem(keys.alert.at, what, right, 'alert and danger');
      return null;
    }
  }
  return { alert, danger };
}

function levelOf(
  { reading }: Build,
  name: string,
  written: Written<string> | null,
  { band }: BuiltBand,
): number | null {
  if (written === null) return null;
  const parsed = parseLevel(written.value, band.quantity, band.display.text);
  const example = `write for example: ${name}: ${printLevel(band.display.inSi, band.display)}`;
  if (!parsed.ok) {
    const right = parsed.instead === null ? example : reading.write(written.at, asYaml(parsed.instead));
    reading.problem(written.at, `${name}: ${parsed.what}`, right, name);
    return null;
  }
  if (parsed.value.value > 0) return parsed.value.value;
  reading.problem(written.at, `${name}: '${written.value}' is not above 0`, example, name);
  return null;
}
