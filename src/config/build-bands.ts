import { integrationsBetween } from '../signal/integration.ts';
import { octaveBands } from '../signal/octaves.ts';
import { type BandCase, judgeBand } from './bands.ts';
import { decibelsKnown, decibelUnit } from './decibel.ts';
import { judgeEnvelopeBand } from './envelope-bands.ts';
import { hasEnvelope } from './envelope-settings.ts';
import { type Build, tellDoubledIds, valuesOf } from './layers.ts';
import type { Decibels } from './level.ts';
import { printFrequency } from './print-value.ts';
import { parseFrequency } from './quantity.ts';
import type { bandKeys } from './schema-bands.ts';
import type { Written } from './shape.ts';
import type { ReadMap } from './shape-map.ts';
import type { Band, DisplayUnit, Quantity, SignalSettings } from './site.ts';
import { asYaml } from './site-text.ts';
import { usualDisplayUnit } from './units.ts';

export type WrittenBand = Written<ReadMap<typeof bandKeys>>;
/** Lists of the machine type, the machine, the point: outermost first. */
export type ListLayers<T> = readonly (Written<readonly T[]> | null)[];

export interface BuiltBand {
  readonly band: Band;
  readonly written: WrittenBand;
}

export interface BuiltBands {
  readonly bands: readonly BuiltBand[];
  /** Ids that are known but give no level here: refused, or left out since the point cannot give them. */
  readonly absent: ReadonlySet<string>;
}

/** The bands of one point: a band of an inner list replaces the outer one of the same id. */
export function buildBands(
  build: Build,
  layers: ListLayers<WrittenBand>,
  point: {
    readonly quantity: Quantity;
    readonly signal: SignalSettings | null;
    readonly sidecar: boolean;
    readonly situation: BandCase;
  },
): BuiltBands {
  const chosen = new Map<string, { readonly written: WrittenBand; readonly layer: number }>();
  layers.forEach((layer, index) => {
    for (const written of layer?.value ?? []) {
      const id = written.value.keys.id;
      if (id !== null && chosen.get(id.value)?.layer !== index)
        chosen.set(id.value, { written, layer: index });
    }
  });
  const bands: BuiltBand[] = [];
  const absent = new Set<string>();
  for (const [id, { written, layer }] of chosen) {
    const own = layer === layers.length - 1;
    const band = buildBand(build, written, own, point);
    if (band === null) absent.add(id);
    else {
      bands.push({ band, written });
      tellFindings(build, { band, written }, point.situation);
    }
  }
  return { bands, absent };
}

export function tellDoubledBands({ reading }: Build, list: Written<readonly WrittenBand[]> | null): void {
  const ids = (list?.value ?? []).flatMap(({ value: { keys } }) =>
    keys.id === null ? [] : [{ id: keys.id.value, at: keys.id.at }],
  );
  tellDoubledIds(reading, ids, (id, line) => `band '${id}' stands twice, first in line ${line}`);
}

function buildBand(
  build: Build,
  written: WrittenBand,
  own: boolean,
  point: Parameters<typeof buildBands>[2],
): Band | null {
  const { id, from, to, unit, quantity: asked, formerly } = written.value.keys;
  if (id === null || from === null || to === null) return null;
  if (refusedKey(written, 'unit') || refusedKey(written, 'quantity')) return null;
  const quantity = asked?.value ?? unitQuantity(unit?.value) ?? point.quantity;
  const ofEnvelope = written.value.keys.of?.value === 'envelope';
  const display = displayOf(build, id.value, quantity, unit, point);
  if (display === null) return null;
  if (!edgesAgree(build, id.value, from, to)) return null;
  if (
    !canBeGiven(
      build,
      written,
      { id: id.value, ofEnvelope, quantity, inOrders: from.value.inOrders, own },
      point,
    )
  )
    return null;
  return {
    id: id.value,
    formerly: valuesOf(formerly),
    ...(ofEnvelope ? { of: 'envelope' as const } : {}),
    quantity,
    from: from.value.value,
    to: to.value.value,
    inOrders: from.value.inOrders,
    display,
  };
}

type AskedUnit = DisplayUnit | Decibels;

function unitQuantity(unit: AskedUnit | undefined): Quantity | null {
  return unit === undefined ? null : 'decibelsOf' in unit ? unit.decibelsOf : unit.quantity;
}

/** How people see the band; null where its unit is of another quantity, or of none that has decibels. */
function displayOf(
  { reading }: Build,
  id: string,
  quantity: Quantity,
  unit: Written<AskedUnit> | null,
  { signal }: Pick<Parameters<typeof buildBands>[2], 'signal'>,
): DisplayUnit | null {
  if (unit === null) return usualDisplayUnit(quantity, signal?.samplesIn.text);
  const { value, at } = unit;
  const usual = reading.write(at, usualDisplayUnit(quantity).text);
  const isOf = unitQuantity(value);
  if (isOf !== null && isOf !== quantity) {
    const written = 'decibelsOf' in value ? decibelUnit(isOf)?.text : value.text;
    reading.problem(at, `band '${id}' is ${quantity}, its unit ${written} is ${isOf}`, usual, 'unit');
    return null;
  }
  if (!('decibelsOf' in value)) return value;
  const display = decibelUnit(quantity);
  if (display === null) {
    const what = `band '${id}' is ${quantity}, of which there are no decibels (${decibelsKnown()})`;
    reading.problem(at, what, usual, 'unit');
  }
  return display;
}

type WrittenEdge = Written<{ readonly value: number; readonly inOrders: boolean }>;

function edgesAgree({ reading }: Build, id: string, from: WrittenEdge, to: WrittenEdge): boolean {
  if (from.value.inOrders !== to.value.inOrders) {
    const right = 'give both in Hz, or both in orders (0.5x)';
    reading.problem(to.at, `band '${id}' begins and ends in different units`, right, 'orders');
    return false;
  }
  if (from.value.value < to.value.value) return true;
  reading.problem(
    to.at,
    `band '${id}' does not end above its begin`,
    'compare from and to',
    'order of edges',
  );
  return false;
}

/** Can this point give the band at all? A shared band that it cannot give is left out with a warning. */
function canBeGiven(
  { reading }: Build,
  written: WrittenBand,
  band: {
    readonly id: string;
    readonly ofEnvelope: boolean;
    readonly quantity: Quantity;
    readonly inOrders: boolean;
    readonly own: boolean;
  },
  { quantity: measured, sidecar, situation }: Parameters<typeof buildBands>[2],
): boolean {
  const derived = band.ofEnvelope
    ? envelopeOfQuantity(measured, band.quantity)
    : integrationsBetween(measured, band.quantity);
  if (typeof derived === 'object') {
    if (band.own)
      reading.problem(
        written.at,
        `band '${band.id}': ${derived.reason}`,
        'write another quantity',
        'derived',
      );
    else reading.warn(written.at, `band '${band.id}' is left out at ${situation.shown}: ${derived.reason}`);
    return false;
  }
  if (!band.inOrders || situation.runningSpeedHz !== null || sidecar) return true;
  const what = `band '${band.id}' is in orders, and nothing says the speed of ${situation.shown}`;
  const right = 'add to the machine: running_speed: 2970 rpm, or sidecar: expected under recordings';
  reading.problem(written.value.keys.from?.at ?? written.at, what, right, 'speed');
  return false;
}

/** An envelope is of what is measured: its lines are rates of repetition, which no integration weighs. */
function envelopeOfQuantity(measured: Quantity, asked: Quantity): 0 | { readonly reason: string } {
  if (!hasEnvelope(measured))
    return { reason: `${measured} has no envelope, only acceleration, velocity and sound pressure` };
  return asked === measured ? 0 : { reason: `the envelope of ${measured} is ${measured}, not ${asked}` };
}

function refusedKey({ value: { has, keys } }: WrittenBand, name: keyof typeof bandKeys): boolean {
  return has.has(name) && keys[name] === null;
}

function tellFindings({ reading }: Build, { band, written }: BuiltBand, situation: BandCase): void {
  const judge = band.of === 'envelope' ? judgeEnvelopeBand : judgeBand;
  for (const { refused, edge, rule, what, right, instead } of judge(band, situation)) {
    const at = written.value.keys[edge]?.at ?? written.at;
    if (refused && written.value.has.has('octaves'))
      reading.problem(at, what, rule === 'above range' ? lowerEnd(band, instead) : octaveRemedy(right), rule);
    else if (refused)
      reading.problem(at, what, instead === null ? right : reading.write(at, asYaml(instead)), rule);
    else reading.warn(at, what, rule);
  }
}

/** The edges of an octave band are the standard's; only the range of bands can be another one. */
function octaveRemedy(right: string): string {
  const finer = right.replace(/,? ?(or )?write: (from|to): .*$/, '');
  return finer === '' ? 'begin the octave bands higher' : `${finer}, or begin the octave bands higher`;
}

/** The highest mid-band of which the rate leaves the whole band. `highest`: edge that may not be passed. */
function lowerEnd({ from, to }: Band, highest: string | null): string {
  const limit = highest === null ? null : parseFrequency(highest);
  if (limit?.ok !== true) return 'end the octave bands lower';
  const within = octaveBands(to / from > 1.5 ? 1 : 3, 0, limit.value).filter(
    ({ toHz }) => toHz <= limit.value,
  );
  const last = within[within.length - 1];
  return last === undefined
    ? 'end the octave bands lower'
    : `end the octave bands at ${printFrequency(last.nominalHz)}`;
}
