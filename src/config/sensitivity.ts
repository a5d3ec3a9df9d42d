import { type Parsed, refused, shorten, splitNumber, understood } from './quantity.ts';
import type { Quantity } from './site.ts';
import { unitInOtherCase, unitOf } from './units.ts';

/** Volts (SI) that a sensor gives per SI unit of what it measures. */
export interface Sensitivity {
  readonly voltsPerSi: number;
  readonly quantity: Quantity;
}

const example = '100 mV/g';

/**
 * '100 mV/g', '10 mV/(m/s2)', '4 mV/(mm/s)', '8 V/mm', '50 mV/Pa'; the brackets may be left out.
 * Charge (pC) and current loops are refused: the recorder must see a voltage.
 * Checked: 100 mV/g = 0.0101972 V s²/m; 8 V/mm = 8000 V/m.
 */
export function parseSensitivity(text: string): Parsed<Sensitivity> {
  const split = splitNumber(text);
  if (!split.ok) return split;
  const { number, digits, rest } = split.value;
  if (rest === '') return refused(`'${shorten(text)}' has no unit`, `${digits} mV/g`);
  const match = /^([^/]+)\/\s*\(?([^()]+?)\)?$/u.exec(rest);
  if (match === null)
    return refused(`'${shorten(text)}' is no sensitivity, such as ${example}`, `${digits} mV/g`);
  const [, above, below] = match;
  if (/^\s*pC\s*$/i.test(above)) {
    return refused(
      `'${shorten(text)}' is the charge of a sensor; give the volts behind its amplifier`,
      `${digits} mV/g`,
    );
  }
  const volts = unitOf(above);
  if (volts?.dimension !== 'voltage') {
    const meant = unitInOtherCase(above);
    const instead = meant?.dimension === 'voltage' ? `${digits} ${meant.text}/${bracketed(below)}` : null;
    return refused(`'${shorten(above)}' in '${shorten(text)}' is neither mV nor V`, instead);
  }
  const unit = unitOf(below);
  const quantity = measured(unit?.dimension);
  if (unit === null || quantity === null) {
    const meant = unitInOtherCase(below);
    const known = measured(meant?.dimension) !== null;
    const instead = known ? `${digits} ${volts.text}/${bracketed(meant?.text ?? '')}` : null;
    return refused(
      `'${shorten(below)}' in '${shorten(text)}' is no unit that a sensor measures (g, m/s2, mm/s, in/s, um, mm, mil, Pa, A)`,
      instead,
    );
  }
  if (!(number > 0)) return refused(`a sensitivity is above 0, '${shorten(text)}' is not`, example);
  return understood({ voltsPerSi: (number * volts.inSi) / unit.inSi, quantity });
}

function bracketed(unit: string): string {
  return unit.includes('/') ? `(${unit})` : unit;
}

function measured(dimension: string | undefined): Quantity | null {
  const known: readonly Quantity[] = [
    'acceleration',
    'velocity',
    'displacement',
    'sound-pressure',
    'current',
  ];
  return known.find((quantity) => quantity === dimension) ?? null;
}
