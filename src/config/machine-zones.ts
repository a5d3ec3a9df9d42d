import { printFrequency, printNumber } from './print-value.ts';
import type { Quantity } from './site.ts';
import type { RowConditions, ZoneBoundaries, ZoneRow, ZoneTable, ZoneTableFacts } from './zone-tables.ts';

/** What the site file says of a machine so that its row of a table can be found. */
export interface ZoneChoice {
  readonly powerW: number | null;
  /** Of electrical machines: the distance from the feet to the shaft's middle. */
  readonly shaftHeightM: number | null;
  readonly support: 'rigid' | 'flexible' | null;
  readonly category: 'I' | 'II' | null;
  readonly class: 'I' | 'II' | 'III' | 'IV' | null;
}

/** The part of a zone table that holds for one machine. */
export interface MachineZones extends ZoneTableFacts, ZoneChoice {
  /** 'group 2, rigid'; '' where no row holds. */
  readonly place: string;
  /** One for each quantity that the table knows; none where the machine lies outside the table. */
  readonly boundaries: readonly ZoneBoundaries[];
  /** Why no row holds for this machine, in words; null: one does. */
  readonly outside: string | null;
}

/** Where a point's sensor sits; the tables hold for bearing housings. */
export type SensorPlace = 'bearing-housing' | 'shaft' | 'elsewhere';

/** Rows of a table for a machine. Electrical machines are grouped by shaft height where it is given, all others by power. */
export function zonesOfMachine({ rows, ...facts }: ZoneTable, choice: ZoneChoice): MachineZones {
  const asked = rows.filter(
    ({ when }) =>
      agrees(when.support, choice.support) &&
      agrees(when.category, choice.category) &&
      agrees(when.class, choice.class),
  );
  const fitting = asked.filter(({ when }) => isOfSize(when, choice));
  const [first] = fitting;
  return {
    ...facts,
    ...choice,
    place: first === undefined ? '' : placeText(first.when),
    boundaries: fitting.map(({ when: _, ...boundaries }) => boundaries),
    outside: first === undefined ? outsideText(facts.name, asked, choice) : null,
  };
}

/** 'ISO 20816-3 (group 2, rigid)'. */
export function zonesName({ name, place }: Pick<MachineZones, 'name' | 'place'>): string {
  return place === '' ? name : `${name} (${place})`;
}

function agrees(wanted: string | undefined, given: string | null): boolean {
  return wanted === undefined || wanted === given;
}

function isOfSize(when: RowConditions, { powerW, shaftHeightM }: ZoneChoice): boolean {
  if (shaftHeightM !== null && when.shaftHeightFromMm !== undefined) {
    const mm = Number((shaftHeightM * 1000).toPrecision(12));
    return mm >= when.shaftHeightFromMm && mm < (when.shaftHeightBelowMm ?? Number.POSITIVE_INFINITY);
  }
  if (when.powerAboveKw === undefined) return true;
  if (powerW === null) return false;
  const kw = powerW / 1000;
  return kw > when.powerAboveKw && kw <= (when.powerToKw ?? Number.POSITIVE_INFINITY);
}

function placeText({
  group,
  support,
  category,
  class: ofClass,
  powerAboveKw,
  powerToKw,
}: RowConditions): string {
  if (ofClass !== undefined) return `class ${ofClass}`;
  if (category !== undefined)
    return `category ${category}, ${powerToKw === undefined ? `above ${powerAboveKw} kW` : `up to ${powerToKw} kW`}`;
  return `group ${group}, ${support}`;
}

function outsideText(name: string, asked: readonly ZoneRow[], { powerW, shaftHeightM }: ZoneChoice): string {
  const [first] = asked;
  if (first === undefined) return `${name} has no row for this machine`;
  if (shaftHeightM !== null && first.when.shaftHeightFromMm !== undefined) {
    const least = Math.min(...asked.map(({ when }) => when.shaftHeightFromMm ?? 0));
    return `${name} holds for shaft heights from ${least} mm, this one is ${printNumber(shaftHeightM * 1000)} mm`;
  }
  const above = Math.min(...asked.map(({ when }) => when.powerAboveKw ?? 0));
  const to = Math.max(...asked.map(({ when }) => when.powerToKw ?? Number.POSITIVE_INFINITY));
  const range = Number.isFinite(to) ? ` to ${powerText(to)}` : '';
  return `${name} holds above ${powerText(above)}${range}, this machine has ${powerText((powerW ?? 0) / 1000)}`;
}

function powerText(kw: number): string {
  return kw >= 1000 ? `${printNumber(kw / 1000, 4)} MW` : `${printNumber(kw, 4)} kW`;
}

/** The boundaries that a level is held against, or in words why none are. */
export type BoundariesAnswer =
  | { readonly ok: true; readonly boundaries: ZoneBoundaries }
  | { readonly ok: false; readonly why: string };

/** A band that begins or ends within this of the table's range is over that range. */
const edgeTolerance = 0.01;

/**
 * Boundaries for a level of a quantity between two edges at a running speed: the table names velocity or displacement
 * over one range only, and which range that is depends on the speed.
 */
export function boundariesFor(
  zones: MachineZones,
  level: { readonly quantity: Quantity; readonly fromHz: number; readonly toHz: number },
  speedRpm: number | null,
): BoundariesAnswer {
  const no = (why: string): BoundariesAnswer => ({ ok: false, why });
  const { name, slow, speed } = zones;
  if (zones.outside !== null) return no(zones.outside);
  const boundaries = zones.boundaries.find(({ quantity }) => quantity === level.quantity);
  if (boundaries === undefined) {
    const known = zones.boundaries.map(({ quantity }) => quantity).join(' or ');
    return no(
      `${name} judges ${known}, this is ${level.quantity === 'other' ? 'another quantity' : level.quantity}`,
    );
  }
  if (speedRpm === null) return no(`the running speed is not known, so neither is the range of ${name}`);
  const rpm = printNumber(speedRpm, 4);
  if (speed !== null && speedRpm < speed.fromRpm)
    return no(`${name} holds from ${speed.fromRpm} rpm, the machine runs at ${rpm} rpm`);
  if (speed !== null && speed.toRpm !== null && speedRpm > speed.toRpm)
    return no(`${name} holds to ${speed.toRpm} rpm, the machine runs at ${rpm} rpm`);
  const { fromHz, toHz } = rangeAt(zones, speedRpm);
  if (isNear(level.fromHz, fromHz) && isNear(level.toHz, toHz)) return { ok: true, boundaries };
  const at =
    slow === null
      ? ''
      : speedRpm < slow.belowRpm
        ? ` below ${slow.belowRpm} rpm`
        : ` from ${slow.belowRpm} rpm on`;
  return no(
    `the band is over ${printFrequency(level.fromHz)} to ${printFrequency(level.toHz)}, ${name} over ${printFrequency(fromHz)} to ${printFrequency(toHz)}${at}`,
  );
}

/** The range over which the table's levels are taken at a speed. */
export function rangeAt(
  { frequency, slow }: Pick<MachineZones, 'frequency' | 'slow'>,
  speedRpm: number,
): { readonly fromHz: number; readonly toHz: number } {
  const fromHz = slow !== null && speedRpm < slow.belowRpm ? slow.fromHz : frequency.fromHz;
  return { fromHz, toHz: frequency.toHz };
}

function isNear(hz: number, wantedHz: number): boolean {
  return Math.abs(hz - wantedHz) <= edgeTolerance * wantedHz;
}

/**
 * Null where the sensor sits on a bearing housing. A sensor of displacement usually looks at the shaft, which
 * these tables do not judge, so that one must be said to sit on the housing.
 */
export function notOnHousing(
  point: { readonly quantity: Quantity; readonly sensorOn?: SensorPlace | null },
  { name }: Pick<MachineZones, 'name'>,
): string | null {
  const place = point.sensorOn ?? (point.quantity === 'displacement' ? 'shaft' : 'bearing-housing');
  if (place === 'bearing-housing') return null;
  if (place === 'elsewhere')
    return `the sensor sits elsewhere than on a bearing housing, for which ${name} holds`;
  const said = point.sensorOn == null ? '; if it does sit there, say sensor_on: bearing-housing' : '';
  return `the sensor looks at the shaft, ${name} holds for bearing housings${said}`;
}
