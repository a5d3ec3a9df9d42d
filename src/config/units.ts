import type { Detector, DisplayUnit, Quantity, SampleUnit } from './site.ts';

/** Standard acceleration of free fall, exact (3rd CGPM 1901; ISO 80000-3). */
export const standardGravity = 9.80665;

/** What a unit measures: a quantity of a point, or one of the other physical values of the site file. */
export type Dimension =
  | Quantity
  | 'frequency'
  | 'order'
  | 'ratio'
  | 'time'
  | 'recordings'
  | 'power'
  | 'bytes'
  | 'length'
  | 'angle';

export interface Unit {
  /** The way this project prints it. */
  readonly text: string;
  readonly dimension: Dimension;
  /** Size in the SI unit of the dimension: m/s², m/s, m, Pa, V, A, Hz, W; else orders, percent, ms, bytes, degrees. */
  readonly inSi: number;
  /** Other spellings that are accepted. */
  readonly also?: readonly string[];
  /** True where the trade reads a level in this unit as r.m.s., peak or peak to peak by habit of the place. */
  readonly detectorNeeded?: boolean;
}

const second = 1000;
const inch = 0.0254; // exact, international inch of 1959

/** Every unit of the site file. A spelling is compared after `plainSpelling`, letters in their own case. */
export const units: readonly Unit[] = [
  { text: 'm/s²', dimension: 'acceleration', inSi: 1 },
  { text: 'g', dimension: 'acceleration', inSi: standardGravity },
  { text: 'mm/s', dimension: 'velocity', inSi: 1e-3 },
  { text: 'in/s', dimension: 'velocity', inSi: inch, detectorNeeded: true },
  { text: 'µm', dimension: 'displacement', inSi: 1e-6, detectorNeeded: true },
  { text: 'mm', dimension: 'displacement', inSi: 1e-3, detectorNeeded: true },
  { text: 'mil', dimension: 'displacement', inSi: inch / 1000, detectorNeeded: true },
  { text: 'Pa', dimension: 'sound-pressure', inSi: 1 },
  { text: 'mV', dimension: 'voltage', inSi: 1e-3 },
  { text: 'V', dimension: 'voltage', inSi: 1 },
  { text: 'mA', dimension: 'current', inSi: 1e-3 },
  { text: 'A', dimension: 'current', inSi: 1 },
  { text: 'in', dimension: 'length', inSi: inch },
  { text: 'deg', dimension: 'angle', inSi: 1, also: ['°', 'degrees', 'degree'] },
  { text: 'Hz', dimension: 'frequency', inSi: 1 },
  { text: 'kHz', dimension: 'frequency', inSi: 1000 },
  { text: 'rpm', dimension: 'frequency', inSi: 1 / 60, also: ['r/min', '1/min'] },
  { text: 'x', dimension: 'order', inSi: 1 },
  { text: '%', dimension: 'ratio', inSi: 1, also: ['percent'] },
  { text: 'ms', dimension: 'time', inSi: 1 },
  { text: 's', dimension: 'time', inSi: second },
  { text: 'min', dimension: 'time', inSi: 60 * second },
  { text: 'h', dimension: 'time', inSi: 3600 * second },
  { text: 'd', dimension: 'time', inSi: 86_400 * second, also: ['day', 'days'] },
  { text: 'recordings', dimension: 'recordings', inSi: 1, also: ['recording'] },
  { text: 'W', dimension: 'power', inSi: 1 },
  { text: 'kW', dimension: 'power', inSi: 1000 },
  { text: 'MW', dimension: 'power', inSi: 1e6 },
  { text: 'MB', dimension: 'bytes', inSi: 1e6 },
  { text: 'GB', dimension: 'bytes', inSi: 1e9 },
];

/** Both micro signs as u, superscript and caret two as 2, no spaces: 'µm' and 'μm' give 'um', 'm/s^2' gives 'm/s2'. */
export function plainSpelling(text: string): string {
  return text
    .replace(/[µμ]/g, 'u')
    .replace(/\^?²|\^2/g, '2')
    .replace(/\s/g, '');
}

const bySpelling = new Map<string, Unit>();
for (const unit of units) {
  for (const spelling of [unit.text, ...(unit.also ?? [])]) bySpelling.set(plainSpelling(spelling), unit);
}

/** The unit of a spelling, or null. */
export function unitOf(spelling: string): Unit | null {
  return bySpelling.get(plainSpelling(spelling)) ?? null;
}

/** The unit that differs from a spelling only in upper and lower case ('khz', 'RPM'), or null where none or several do. */
export function unitInOtherCase(spelling: string): Unit | null {
  const wanted = plainSpelling(spelling).toLowerCase();
  const found = new Set(
    [...bySpelling].filter(([known]) => known.toLowerCase() === wanted).map(([, unit]) => unit),
  );
  return found.size === 1 ? [...found][0] : null;
}

/** Spellings of a dimension for messages, e.g. 'Hz, kHz or rpm'. */
export function unitsFor(dimension: Dimension): string {
  const texts = units.filter((unit) => unit.dimension === dimension).map((unit) => unit.text);
  return texts.length > 1 ? `${texts.slice(0, -1).join(', ')} or ${texts.at(-1)}` : (texts[0] ?? 'no unit');
}

/** What a sinusoid's r.m.s. is multiplied by: 1, sqrt 2, 2 sqrt 2. For anything but one sinusoid the result is derived. */
export const detectorFactor: Readonly<Record<Detector, number>> = {
  rms: 1,
  peak: Math.SQRT2,
  'peak-to-peak': 2 * Math.SQRT2,
};

/** The unit in which samples of a quantity are stored and levels are computed. */
export function siUnit(quantity: Quantity): SampleUnit {
  return { text: siText[quantity], quantity, inSi: 1 };
}

const siText: Readonly<Record<Quantity, string>> = {
  acceleration: 'm/s²',
  velocity: 'm/s',
  displacement: 'm',
  'sound-pressure': 'Pa',
  voltage: 'V',
  current: 'A',
  other: '',
};

export function displayUnit(unit: SampleUnit, detector: Detector, detectorNeeded = false): DisplayUnit {
  const word = { rms: detectorNeeded ? ' r.m.s.' : '', peak: ' peak', 'peak-to-peak': ' peak to peak' }[
    detector
  ];
  const derived = detector === 'rms' ? '' : ' (derived)';
  return { text: `${unit.text}${word}${derived}`, quantity: unit.quantity, inSi: unit.inSi, detector };
}

/** How a band of this quantity is shown where the site file names no unit: m/s², mm/s, µm, Pa, V, A, all r.m.s. */
export function usualDisplayUnit(quantity: Quantity, otherText = ''): DisplayUnit {
  if (quantity === 'velocity') return displayUnit({ text: 'mm/s', quantity, inSi: 1e-3 }, 'rms');
  if (quantity === 'displacement') return displayUnit({ text: 'µm', quantity, inSi: 1e-6 }, 'rms', true);
  if (quantity === 'other') return displayUnit({ text: otherText, quantity, inSi: 1 }, 'rms');
  return displayUnit(siUnit(quantity), 'rms');
}
