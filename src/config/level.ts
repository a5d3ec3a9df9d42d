import { decibelUnit, isDecibel, parseDecibels, parseDecibelUnit } from './decibel.ts';
import {
  type Parsed,
  parsePhysical,
  refused,
  shorten,
  splitNumber,
  understood,
  unitAtStart,
} from './quantity.ts';
import type { Detector, DisplayUnit, Quantity, SampleUnit } from './site.ts';
import {
  type Dimension,
  detectorFactor,
  displayUnit,
  type Unit,
  unitInOtherCase,
  unitsFor,
} from './units.ts';

/** A level as written: `value` in SI r.m.s., with the unit and detector in which people want to read it. */
export interface Level {
  readonly value: number;
  readonly display: DisplayUnit;
}

const quantities: readonly Quantity[] = [
  'acceleration',
  'velocity',
  'displacement',
  'sound-pressure',
  'voltage',
  'current',
];

const detectorWords: ReadonlyMap<string, Detector> = new Map([
  ['rms', 'rms'],
  ['peak', 'peak'],
  ['pp', 'peak-to-peak'],
  ['peaktopeak', 'peak-to-peak'],
]);

/** '' where no word stands; null where the word is none of rms, peak, pp. '(derived)' behind it is understood. */
function detectorOf(word: string): Detector | '' | null {
  const plain = word.toLowerCase().replace(/\(derived\)|[\s.-]/g, '');
  return plain === '' ? '' : (detectorWords.get(plain) ?? null);
}

/**
 * SI r.m.s. of a level such as '2.8 mm/s', '0.3 in/s peak', '40 um pp'. Peak and peak to peak are derived: the r.m.s.
 * of a sinusoid of that height. mm/s, m/s² and g are r.m.s.; in/s, mil, mm and µm need the word.
 * Checked: 0.3 in/s peak = 5.388154e-3 m/s; 1 in/s peak = 17.960512e-3 m/s.
 */
export function parseLevel(text: string, quantity: Quantity | null = null, otherUnit = ''): Parsed<Level> {
  if (quantity === 'other') return parseOtherLevel(text, otherUnit);
  if (saysDecibels(text)) return parseLevelInDecibels(text, quantity);
  const wanted: readonly Dimension[] = quantity === null ? quantities : [quantity];
  const parsed = parsePhysical(text, wanted, usualUnit(quantity), { words: true });
  if (!parsed.ok) return parsed;
  const { value, number, unit, word } = parsed.value;
  const detector = detectorOf(word);
  if (detector === null) return refusedWord(word, `${number} ${unit.text}`);
  if (detector === '' && unit.detectorNeeded)
    return ambiguous(`${number} ${unit.text}`, unit, `${shorten(text)}`);
  const display = displayUnit(sampleUnit(unit), detector === '' ? 'rms' : detector, unit.detectorNeeded);
  return understood({ value: value / detectorFactor[display.detector], display });
}

function saysDecibels(text: string): boolean {
  const split = splitNumber(text);
  return split.ok && isDecibel(split.value.rest);
}

function parseLevelInDecibels(text: string, quantity: Quantity | null): Parsed<Level> {
  if (quantity === null) return refused(`'${shorten(text)}' in decibels does not say of which quantity`);
  const parsed = parseDecibels(text, quantity);
  const display = decibelUnit(quantity);
  if (!parsed.ok) return parsed;
  return display === null
    ? refused(`no decibels of ${quantity}`)
    : understood({ value: parsed.value, display });
}

function parseOtherLevel(text: string, otherUnit: string): Parsed<Level> {
  const split = splitNumber(text);
  if (!split.ok) return split;
  if (split.value.rest !== otherUnit) {
    return refused(
      `'${shorten(text)}' is not in the unit of the samples`,
      `${split.value.digits} ${otherUnit}`,
    );
  }
  const display = displayUnit({ text: otherUnit, quantity: 'other', inSi: 1 }, 'rms');
  return understood({ value: split.value.number, display });
}

/** Decibels, of the quantity that the reference behind them names; null: of whatever the band is of. */
export interface Decibels {
  readonly decibelsOf: Quantity | null;
}

/** A band's `unit:` such as 'mm/s', 'g', 'in/s peak', 'mil pp', 'dB'. */
export function parseDisplayUnit(text: string): Parsed<DisplayUnit | Decibels> {
  if (isDecibel(text)) {
    const parsed = parseDecibelUnit(text);
    return parsed.ok ? understood({ decibelsOf: parsed.value }) : parsed;
  }
  const found = unitAtStart(text.trim());
  if (found === null || !isQuantity(found.unit.dimension)) {
    const meant = unitInOtherCase(text);
    const instead = meant !== null && isQuantity(meant.dimension) ? meant.text : null;
    return refused(`'${shorten(text)}' is no unit of a level (${levelUnits()})`, instead);
  }
  const detector = detectorOf(found.word);
  if (detector === null) return refusedWord(found.word, found.unit.text);
  if (detector === '' && found.unit.detectorNeeded)
    return ambiguous(found.unit.text, found.unit, found.unit.text);
  return understood(
    displayUnit(sampleUnit(found.unit), detector === '' ? 'rms' : detector, found.unit.detectorNeeded),
  );
}

/** What samples are: 'V', 'm/s2', 'g', 'um'. Samples are instantaneous values, so no detector word. */
export function parseSampleUnit(text: string): Parsed<SampleUnit> {
  const found = unitAtStart(text.trim());
  if (found !== null && found.word !== '' && isQuantity(found.unit.dimension)) {
    return refused(
      `samples are momentary values, so '${shorten(found.word)}' does not belong here`,
      found.unit.text,
    );
  }
  if (found !== null && isQuantity(found.unit.dimension)) return understood(sampleUnit(found.unit));
  const meant = unitInOtherCase(text);
  return refused(
    `'${shorten(text)}' is no unit of samples (${levelUnits()})`,
    meant !== null && isQuantity(meant.dimension) ? meant.text : null,
  );
}

/** A momentary value with its unit, such as `full_scale: 10 V`; `value` is in SI. */
export function parseSampleValue(
  text: string,
): Parsed<{ readonly value: number; readonly unit: SampleUnit }> {
  const parsed = parsePhysical(text, quantities, 'V');
  if (!parsed.ok) return parsed;
  return understood({ value: parsed.value.value, unit: sampleUnit(parsed.value.unit) });
}

function refusedWord(word: string, before: string): Parsed<never> {
  return refused(`'${shorten(word)}' behind the unit is none of rms, peak, pp`, `${before} rms`);
}

function ambiguous(text: string, unit: Unit, written: string): Parsed<never> {
  const why =
    unit.dimension === 'velocity'
      ? 'a peak value read as r.m.s. alarms 41 % too late'
      : 'a peak to peak value read as r.m.s. alarms only at 2.8 times the level';
  const usual = unit.dimension === 'velocity' ? 'peak' : 'pp';
  return refused(`'${written}' does not say rms, peak or pp, and ${why}`, `${text} ${usual}`);
}

function sampleUnit(unit: Unit): SampleUnit {
  return { text: unit.text, quantity: unit.dimension as Quantity, inSi: unit.inSi };
}

function isQuantity(dimension: Dimension): boolean {
  return (quantities as readonly Dimension[]).includes(dimension);
}

function levelUnits(): string {
  return quantities.map((quantity) => unitsFor(quantity)).join(', ');
}

function usualUnit(quantity: Quantity | null): string {
  if (quantity === null || quantity === 'velocity') return 'mm/s';
  return quantity === 'displacement' ? 'um pp' : unitsFor(quantity).split(/, | or /)[0];
}
