import type { DisplayUnit } from './site.ts';
import { detectorFactor, usualDisplayUnit } from './units.ts';

/**
 * A number for people, with so many significant figures (three unless asked otherwise), never with an exponent
 * between 1e-6 and 1e9; trailing zeros behind the point are dropped.
 * Checked: 0.0028349 -> '0.00283', 12345.6 -> '12300', 2.8 -> '2.8'.
 */
export function printNumber(value: number, figures = 3): string {
  if (!Number.isFinite(value)) return String(value);
  if (value === 0) return '0';
  const rounded = Number(value.toPrecision(figures));
  const size = Math.abs(rounded);
  if (size >= 1e9 || size < 1e-6) return rounded.toExponential(figures - 1).replace(/\.?0+e/, 'e');
  const decimals = Math.max(0, figures - 1 - Math.floor(Math.log10(size)));
  const text = rounded.toFixed(decimals);
  return text.includes('.') ? text.replace(/\.?0+$/, '') : text;
}

/** The number that stands before a display unit: SI r.m.s. to the unit and its detector, or to decibels. */
export function inDisplayUnit(siRms: number, display: DisplayUnit): number {
  if (display.decibelReference !== undefined) return 20 * Math.log10(siRms / display.decibelReference);
  return (siRms / display.inSi) * detectorFactor[display.detector];
}

/** 0.0028 m/s in mm/s -> '2.8 mm/s'; 0.005388154 m/s in in/s peak -> '0.3 in/s peak (derived)'. */
export function printLevel(siRms: number, display: DisplayUnit, figures = levelFigures(display)): string {
  return `${printNumber(inDisplayUnit(siRms, display), figures)} ${display.text}`.trimEnd();
}

/** A decibel more is 12 %, so levels in decibels have their tenths. */
export function levelFigures({ decibelReference }: DisplayUnit): number {
  return decibelReference === undefined ? 3 : 4;
}

/** The unit for a difference of two levels, which has no decibels: the SI unit, where the levels are in decibels. */
export function differenceUnit(display: DisplayUnit): DisplayUnit {
  return display.decibelReference === undefined ? display : usualDisplayUnit(display.quantity);
}

/** '950 Hz', '2 kHz', '25.6 kHz'. */
export function printFrequency(hz: number, figures = 4): string {
  return Math.abs(hz) >= 2000 ? `${printNumber(hz / 1000, figures)} kHz` : `${printNumber(hz, figures)} Hz`;
}

/** Hz as people state a shaft: '2970 rpm'. */
export function printSpeed(hz: number, figures = 4): string {
  return `${printNumber(hz * 60, figures)} rpm`;
}

const times: readonly (readonly [string, number])[] = [
  ['d', 86_400_000],
  ['h', 3_600_000],
  ['min', 60_000],
  ['s', 1000],
];

/** The largest unit that a time fills a whole number of times, so that nothing is lost: '90 min', '2 h', '250 ms'. */
export function printDuration(ms: number): string {
  const fitting = times.find(([, size]) => ms !== 0 && ms % size === 0);
  return fitting === undefined ? `${ms} ms` : `${ms / fitting[1]} ${fitting[0]}`;
}

/** Seconds for people, three figures: '0.64 s', '10.2 s'; from two minutes on '10 min', '2 min 20 s', '1 h 30 min'. */
export function printSeconds(seconds: number): string {
  if (Math.round(seconds) < 120) return `${printNumber(seconds)} s`;
  const parts: string[] = [];
  let rest = Math.round(seconds);
  for (const [unit, size] of [
    ['h', 3600],
    ['min', 60],
    ['s', 1],
  ] as const) {
    const count = Math.floor(rest / size);
    rest -= count * size;
    if (count > 0 && parts.length < 2) parts.push(`${count} ${unit}`);
  }
  return parts.join(' ');
}

export function printPercent(percent: number): string {
  return `${printNumber(percent)} %`;
}
