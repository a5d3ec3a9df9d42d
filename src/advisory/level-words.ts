import { inDisplayUnit, levelFigures, printNumber } from '../config/print-value.ts';
import type { DisplayUnit } from '../config/site.ts';
import type { LevelFacts } from './facts.ts';

/** Levels, shares and changes as people get them; full precision is for JSON and CSV. */

/** 'mm/s r.m.s.', 'mil peak to peak (derived)': in a message the unit never stands without its detector. */
export function unitText(display: DisplayUnit): string {
  const saysIt = display.detector !== 'rms' || display.text.includes('r.m.s.');
  // A level in decibels is that of an r.m.s. value by the standard of its reference.
  if (saysIt || display.decibelReference !== undefined) return display.text;
  return `${display.text} r.m.s.`.trimStart();
}

/** '5.21': for lists where the unit has been said. `level` in SI r.m.s. */
export function bareLevel(level: number, display: DisplayUnit): string {
  return printNumber(inDisplayUnit(level, display), levelFigures(display));
}

/** '5.21 mm/s r.m.s.'; also for limits. */
export function levelText(level: number, display: DisplayUnit): string {
  return `${bareLevel(level, display)} ${unitText(display)}`;
}

/** '5.21 mm/s r.m.s.', or 'at least 5.21 mm/s r.m.s.' of a clipped recording. */
export function measuredText(level: LevelFacts, display: DisplayUnit): string {
  return `${level.atLeast ? 'at least ' : ''}${levelText(level.level, display)}`;
}

/** '4.98 to 5.46 (95 %)'; of a clipped recording the interval holds only for what was recorded, and says so. */
export function intervalText(level: LevelFacts, display: DisplayUnit): string {
  const low = bareLevel(level.intervalLow, display);
  return `${low} to ${bareLevel(level.intervalHigh, display)} (${printNumber(level.confidencePercent)} %${level.atLeast ? ', of what was recorded' : ''})`;
}

/** '64 %', '0.4 %': a share or a change; whole from ten on, one decimal below. */
export function percentText(ratio: number): string {
  const percent = ratio * 100;
  if (!Number.isFinite(percent)) return 'beyond measure';
  return `${Math.abs(percent) >= 9.95 ? percent.toFixed(0) : printNumber(percent, 2)} %`;
}

/** '16 % over', '28 % under'; within half a thousandth 'at the limit'. Both in one unit. */
export function distanceText(level: number, limit: number): string {
  const ratio = level / limit - 1;
  if (Math.abs(ratio) < 0.0005) return 'at the limit';
  return `${percentText(Math.abs(ratio))} ${ratio > 0 ? 'over' : 'under'}`;
}

/** 'up 42 %', 'down 8 %', 'unchanged'; from four times on 'up to 4.2 times'. */
export function changeText(ratio: number): string {
  if (ratio >= 4) return `up to ${printNumber(ratio, 2)} times`;
  if (Math.abs(ratio - 1) < 0.0005) return 'unchanged';
  return ratio > 1 ? `up ${percentText(ratio - 1)}` : `down ${percentText(1 - ratio)}`;
}

/** '1 recording', '3 recordings'. */
export function counted(count: number, one: string, many = `${one}s`): string {
  return `${count} ${count === 1 ? one : many}`;
}
