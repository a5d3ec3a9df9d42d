import type { BuiltBand, BuiltBands } from './build-bands.ts';
import { curveValues } from './curve-values.ts';
import { bandsFromZones, isFixedUpper, zoneLimit } from './from-zones.ts';
import { type Build, tellDoubledIds, valueOr, valuesOf } from './layers.ts';
import { fixedValues, type KindParts, type LimitCase } from './limit-values.ts';
import { nearest } from './nearest.ts';
import { baselineValues, ceilingsOf, changeValues, rateValues, statisticalValues } from './rule-values.ts';
import type { WrittenLimit, WrittenLimits } from './schema-limits.ts';
import type { Written } from './shape.ts';
import type { Limit, LimitKind } from './site.ts';
import { suppressionsOf, type WrittenSuppressions } from './suppressed-while.ts';
import { zoneValues } from './zone-limit-values.ts';
import type { ZoneCase } from './zone-limits.ts';

/** Lists, or `from zones`, of the machine type, the machine, the point: outermost first. */
export type LimitLayers = readonly (Written<WrittenLimits> | null)[];

/** One entry a kind. */
const kinds: Readonly<
  Record<LimitKind, (build: Build, written: WrittenLimit, limit: LimitCase) => KindParts | null>
> = {
  fixed: fixedValues,
  zone: zoneValues,
  baseline: baselineValues,
  statistical: statisticalValues,
  change: changeValues,
  rate: rateValues,
  curve: curveValues,
};

/** Keys that one kind alone knows. */
const keysOfKind: Readonly<Record<string, readonly LimitKind[]>> = {
  k: ['statistical'],
  danger_k: ['statistical'],
  over: ['rate'],
  curve: ['curve'],
  baseline: ['zone'],
};

/** The limits of one point: a limit of an inner list replaces the outer one of the same id. */
export function buildLimits(
  build: Build,
  layers: LimitLayers,
  bands: BuiltBands,
  of: LimitPlace,
): readonly Limit[] {
  const chosen = new Map<string, { readonly written: WrittenLimit; readonly layer: number }>();
  layers.forEach((layer, index) => {
    if (layer === null) return;
    const judged = layer.value.fromZones
      ? bandsFromZones(build, layer.at, bands, { ...of, shared: index < layers.length - 1 })
      : [];
    const fromZones = judged.map((bandId) => {
      const outer = [...chosen].filter(([, { written }]) => isFixedUpper(written, bandId));
      for (const [id] of outer) chosen.delete(id);
      return zoneLimit(bandId, layer.at, outer[0]?.[1].written ?? null);
    });
    for (const written of [...fromZones, ...layer.value.list]) {
      const id = limitId(written);
      if (id !== null && chosen.get(id)?.layer !== index) chosen.set(id, { written, layer: index });
    }
  });
  const limits: Limit[] = [];
  for (const [id, { written }] of chosen) {
    const limit = buildLimit(build, id, written, bands, of);
    if (limit !== null) limits.push(limit);
  }
  return limits.map((limit) => withCeilings(limit, limits, bands, of));
}

/** Where the limits are and what may speak of them. */
export interface LimitPlace {
  /** 'blower-1/de-h'. */
  readonly shown: string;
  readonly zoneCase: ZoneCase;
  /** Operating conditions of the machine. */
  readonly conditions: readonly string[];
  /** Of the machine, of the point. */
  readonly suppressedWhile: readonly WrittenSuppressions[];
  /** Of the intervals of the point's levels. */
  readonly confidencePercent: number;
}

/** A value learned from a baseline never passes the standard's ceiling, nor, without one, the site's fixed limit. */
function withCeilings(
  limit: Limit,
  all: readonly Limit[],
  { bands }: BuiltBands,
  { shown, zoneCase }: LimitPlace,
): Limit {
  const band = bands.find((one) => one.band.id === limit.bandId);
  if (band === undefined || (limit.rule?.by !== 'baseline' && limit.rule?.by !== 'spread')) return limit;
  const fixed = all.find(
    (one) =>
      one.bandId === limit.bandId && one.kind === 'fixed' && one.side === 'upper' && holdsWith(one, limit),
  );
  const ceilings = ceilingsOf({ band, zoneCase, shown }, fixed ?? null);
  return ceilings === undefined ? limit : { ...limit, ceilings };
}

/** What a fixed limit says of some operating conditions is no ceiling in the others. */
function holdsWith(fixed: Limit, learned: Limit): boolean {
  const [within, asked] = [fixed.conditions ?? null, learned.conditions ?? null];
  return within === null || asked?.every((condition) => within.includes(condition)) === true;
}

export function tellDoubledLimits({ reading }: Build, layer: LimitLayers[number]): void {
  const ids = (layer?.value.list ?? []).flatMap((written) => {
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
  of: LimitPlace,
): Limit | null {
  const { shown, zoneCase } = of;
  const { keys } = written.value;
  if (keys.band === null) return null;
  const bandId = keys.band.value;
  const band = bands.find((one) => one.band.id === bandId);
  if (band === undefined) {
    if (!absent.has(bandId)) tellUnknownBand(build, keys.band, bands, shown);
    return null;
  }
  // A kind that was refused has been told; what its limit lacks or has too much, nobody knows.
  if (keys.kind === null && written.value.has.has('kind')) return null;
  const kind = valueOr(keys.kind, 'fixed');
  if (!keysFit(build, written, kind)) return null;
  const parts = kinds[kind](build, written, { band, zoneCase, shown });
  if (parts === null) return null;
  const confident = keys.confidence !== null;
  const suppressedWhile = suppressionsOf(shown, keys.suppressed_while, ...of.suppressedWhile);
  tellOtherConfidence(build, keys.confidence, of.confidencePercent);
  return {
    id,
    formerly: valuesOf(keys.formerly),
    bandId,
    kind,
    side: valueOr(keys.side, 'upper'),
    ...parts,
    ...(confident ? { confident } : {}),
    conditions: conditionsOf(build, written, of),
    ...(suppressedWhile.length === 0 ? {} : { suppressedWhile }),
    // At three recordings single knocks raise nothing, and a learned limit stands nearer to what is usual.
    onDelay: valueOr(keys.on_delay, { recordings: kind === 'statistical' ? 3 : 2 }),
    offDelay: valueOr(keys.off_delay, { recordings: 1 }),
    deadbandPercent: valueOr(keys.deadband, 10),
    latching: valueOr(keys.latching, false),
    sayAgainPercent: keys.say_again_at === null ? 25 : keys.say_again_at.value,
    action: keys.action === null ? null : keys.action.value,
    respondWithinMs: keys.respond_within === null ? null : keys.respond_within.value,
    ...againAndAgain(written),
  };
}

/** What is told again without a change of level, where the limit says something of it. */
function againAndAgain({
  value: { keys },
}: WrittenLimit): Pick<Limit, 'sayAgainAfterMs' | 'remindAfterMs' | 'thenTo'> {
  const { say_again_after: again, remind_after: remind, then_to: next } = keys;
  return {
    ...(again === null ? {} : { sayAgainAfterMs: again.value }),
    ...(remind === null ? {} : { remindAfterMs: remind.value }),
    ...(next === null ? {} : { thenTo: valuesOf(next) }),
  };
}

function keysFit({ reading }: Build, { value: { keys, has } }: WrittenLimit, kind: LimitKind): boolean {
  const wrong = [...has].filter((name) => keysOfKind[name]?.includes(kind) === false);
  for (const name of wrong) {
    const at = keys[name as keyof typeof keys]?.at;
    const right = `leave it out, or write kind: ${keysOfKind[name].join(' or ')}`;
    if (at !== undefined) reading.problem(at, `${name} has no meaning in a limit of kind ${kind}`, right);
  }
  return wrong.length === 0;
}

/** A level has one interval; a limit cannot ask for another. */
function tellOtherConfidence(
  { reading }: Build,
  written: Written<number> | null,
  confidencePercent: number,
): void {
  if (written === null || written.value === confidencePercent) return;
  const what = `confidence ${written.value} % is not that of the levels' intervals, ${confidencePercent} %`;
  const right = `${reading.write(written.at, `${confidencePercent} %`)}, or set confidence under analysis`;
  reading.problem(written.at, what, right, 'confidence of the limit');
}

function conditionsOf(
  { reading }: Build,
  { value: { keys } }: WrittenLimit,
  { shown, conditions }: LimitPlace,
): readonly string[] | null {
  if (keys.conditions === null) return null;
  for (const { value, at } of keys.conditions.value) {
    if (conditions.includes(value)) continue;
    const meant = nearest(value, conditions);
    const all =
      conditions.length === 0
        ? 'add conditions: to the machine, each with id and speed or load'
        : `its conditions are ${conditions.join(', ')}`;
    reading.problem(
      at,
      `the machine of ${shown} has no operating condition '${value}'`,
      meant === null ? all : reading.write(at, meant),
      'unknown operating condition',
    );
  }
  return valuesOf(keys.conditions);
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
