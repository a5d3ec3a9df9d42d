import { type Dimension, type Unit, unitInOtherCase, unitOf, unitsFor } from './units.ts';

/** A value that was understood, or what is wrong with its text and, where it can be said, the text that would be right. */
export type Parsed<T> =
  | { readonly ok: true; readonly value: T }
  | { readonly ok: false; readonly what: string; readonly instead: string | null };

export function understood<T>(value: T): Parsed<T> {
  return { ok: true, value };
}

export function refused(what: string, instead: string | null = null): Parsed<never> {
  return { ok: false, what, instead };
}

/** A number and the text after it, e.g. 2.8 and 'mm/s'. */
export interface NumberAndRest {
  readonly number: number;
  readonly digits: string;
  readonly rest: string;
}

/** A number with a known unit; `value` is in the SI unit of the unit's dimension (times in ms, ratios in percent). */
export interface PhysicalValue {
  readonly value: number;
  readonly number: number;
  readonly unit: Unit;
  /** What stood behind the unit: a detector word, for levels. */
  readonly word: string;
}

/**
 * Splits '2.8 mm/s' after its number. Decimal commas, thousands separators and anything without a leading number are
 * refused, with the text that would be right.
 */
export function splitNumber(text: string): Parsed<NumberAndRest> {
  const match = /^([+-]?)(\d[\d.,']*|\.\d+)([eE][+-]?\d+(?![\w]))?\s*(.*)$/su.exec(text.trim());
  if (match === null) return refused(`'${shorten(text)}' does not begin with a number`);
  const [, sign, mantissa, exponent = '', rest] = match;
  const spaced = /^\d{3}(?!\d)(.*)$/su.exec(rest);
  if (spaced !== null && /^\d{1,3}$/.test(mantissa)) {
    const instead = `${sign}${mantissa}${rest.slice(0, 3)}${spaced[1]}`;
    return refused(`'${shorten(text)}' has a space between its digits`, instead);
  }
  if (!/^(\d+\.?\d*|\.\d+)$/.test(mantissa))
    return refusedDigits(text, sign, mantissa, `${exponent} ${rest}`);
  const digits = `${sign}${mantissa}${exponent}`;
  const number = Number(digits);
  if (!Number.isFinite(number)) return refused(`'${shorten(text)}' is too large a number`);
  return understood({ number, digits, rest });
}

function refusedDigits(text: string, sign: string, mantissa: string, tail: string): Parsed<never> {
  const behind = tail.trimEnd();
  if (/^\d{1,3}([,']\d{3})+(\.\d+)?$/.test(mantissa)) {
    const whole = mantissa.replace(/[,']/g, '');
    const fraction = /^(\d+),(\d{3})$/.exec(mantissa);
    const either =
      fraction === null ? '' : ` (or ${sign}${fraction[1]}.${fraction[2]}${behind}, if that was meant)`;
    return refused(
      `'${shorten(text)}' has a separator between its digits${either}`,
      `${sign}${whole}${behind}`,
    );
  }
  if (/^\d+,\d+$/.test(mantissa)) {
    return refused(
      `'${shorten(text)}' has a decimal comma, numbers take a point`,
      `${sign}${mantissa.replace(',', '.')}${behind}`,
    );
  }
  return refused(`'${shorten(text)}' is not a number with a unit`);
}

/**
 * A number with its unit, in one of the dimensions asked for. `example` is the unit that a bare number most likely
 * lacks and stands in the remedy ('10' -> '10 Hz'). Words behind the unit are refused unless `words` is set.
 */
export function parsePhysical(
  text: string,
  dimensions: readonly Dimension[],
  example: string,
  { words = false }: { readonly words?: boolean } = {},
): Parsed<PhysicalValue> {
  const split = splitNumber(text);
  if (!split.ok) return split;
  const { number, digits, rest } = split.value;
  if (rest === '') return refused(`'${shorten(text)}' has no unit`, `${digits} ${example}`);
  const wanted = dimensions.map((dimension) => unitsFor(dimension)).join(', or ');
  const found = unitAtStart(rest);
  if (found === null) {
    const meant = unitInOtherCase(rest);
    const instead = meant !== null && dimensions.includes(meant.dimension) ? `${digits} ${meant.text}` : null;
    return refused(`'${shorten(rest)}' is no unit known here (${wanted})`, instead);
  }
  const { unit, word } = found;
  if (!dimensions.includes(unit.dimension)) {
    return refused(`'${shorten(text)}' is ${named(unit.dimension)}, wanted is ${wanted}`);
  }
  if (word !== '' && !words)
    return refused(`'${shorten(word)}' behind the unit is not understood`, `${digits} ${unit.text}`);
  return understood({ value: toSi(number, unit), number, unit, word });
}

/** Rounded to 15 digits, so that 0.3 ms x 1000 or 100 x 1e-3 are the numbers people expect. */
function toSi(number: number, unit: Unit): number {
  return unit.inSi === 1 ? number : Number((number * unit.inSi).toPrecision(15));
}

/** The longest unit that the text begins with, at the end of a word, and the words behind it. */
export function unitAtStart(text: string): { readonly unit: Unit; readonly word: string } | null {
  for (let end = Math.min(text.length, 40); end > 0; end--) {
    if (end < text.length && !/[\s(]/.test(text[end])) continue;
    const unit = unitOf(text.slice(0, end));
    if (unit !== null) return { unit, word: text.slice(end).trim() };
  }
  return null;
}

function named(dimension: Dimension): string {
  const names: Partial<Record<Dimension, string>> = {
    ratio: 'a percentage',
    time: 'a time',
    recordings: 'a count of recordings',
    order: 'an order',
    acceleration: 'an acceleration',
    bytes: 'a size',
    angle: 'an angle',
  };
  return names[dimension] ?? `a ${dimension}`;
}

/** Milliseconds from '5 s', '10 min', '2 d'; whole milliseconds, not negative. */
export function parseDuration(text: string, example = 's'): Parsed<number> {
  const parsed = parsePhysical(text, ['time'], example);
  if (!parsed.ok) return parsed;
  if (parsed.value.value < 0) return refused(`'${shorten(text)}' is negative`, text.trim().replace(/^-/, ''));
  return understood(Math.round(parsed.value.value));
}

/** Hz from '10 Hz', '2 kHz', '2970 rpm'. */
export function parseFrequency(text: string, example = 'Hz'): Parsed<number> {
  // Whoever leaves the unit out of a large number means hertz: 2000 is no 2000 kHz.
  const meant = example === 'kHz' && Number(text) >= 100 ? 'Hz' : example;
  const parsed = parsePhysical(text, ['frequency'], meant);
  return parsed.ok ? understood(parsed.value.value) : parsed;
}

/** A band's edge: Hz, or orders of the running speed ('3.5x'). */
export function parseEdge(text: string): Parsed<{ readonly value: number; readonly inOrders: boolean }> {
  const parsed = parsePhysical(text, ['frequency', 'order'], 'Hz');
  if (!parsed.ok) return parsed;
  return understood({ value: parsed.value.value, inOrders: parsed.value.unit.dimension === 'order' });
}

/** Percent from '50 %' or '+25 %'. */
export function parsePercent(text: string): Parsed<number> {
  const parsed = parsePhysical(text, ['ratio'], '%');
  return parsed.ok ? understood(parsed.value.value) : parsed;
}

/** '2 recordings' or '10 min'. */
export function parseDelay(text: string): Parsed<{ readonly recordings: number } | { readonly ms: number }> {
  const parsed = parsePhysical(text, ['recordings', 'time'], 'recordings');
  if (!parsed.ok) return parsed;
  const { value, unit } = parsed.value;
  if (unit.dimension === 'time') {
    return value < 0 ? refused(`'${shorten(text)}' is negative`) : understood({ ms: Math.round(value) });
  }
  if (!Number.isInteger(value) || value < 1 || value > 1000) {
    return refused(`'${shorten(text)}' is not a whole number of recordings from 1 to 1000`, '1 recordings');
  }
  return understood({ recordings: value });
}

/** Metres from '7.94 mm' or '0.3126 in': a size of a part, which has no detector. */
export function parseLength(text: string): Parsed<number> {
  const parsed = parsePhysical(text, ['displacement', 'length'], 'mm');
  return parsed.ok ? understood(parsed.value.value) : parsed;
}

/** Degrees from '15 deg'. */
export function parseAngle(text: string): Parsed<number> {
  const parsed = parsePhysical(text, ['angle'], 'deg');
  return parsed.ok ? understood(parsed.value.value) : parsed;
}

/** Turns for one turn of the running speed: '1x', '0.3433x'. */
export function parseOrder(text: string): Parsed<number> {
  const parsed = parsePhysical(text, ['order'], 'x');
  return parsed.ok ? understood(parsed.value.value) : parsed;
}

/** At most 60 characters of what was written, for messages. */
export function shorten(text: string): string {
  const line = text.replace(/\s+/g, ' ').trim();
  return line.length > 60 ? `${line.slice(0, 57)}...` : line;
}
