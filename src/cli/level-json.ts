import { inDisplayUnit } from '../config/print-value.ts';
import type { DisplayUnit } from '../config/site.ts';
import { units } from '../config/units.ts';

/** A level with its interval in the unit and by the detector in which people read it, in full precision. */
export function levelJson(
  level: { readonly level: number; readonly intervalLow: number; readonly intervalHigh: number },
  display: DisplayUnit,
) {
  return {
    unit: bareUnit(display),
    detector: display.detector,
    level: inDisplayUnit(level.level, display),
    interval_low: inDisplayUnit(level.intervalLow, display),
    interval_high: inDisplayUnit(level.intervalHigh, display),
  };
}

/** A limit as it was written, 7.1 and not 7.1000000000000005: 15 figures survive the way to SI and back. */
export function limitJson(limit: number | null, display: DisplayUnit): number | null {
  return limit === null ? null : Number(inDisplayUnit(limit, display).toPrecision(15));
}

/** 'in/s' of 'in/s peak (derived)': the detector stands beside it. Decibels keep their reference. */
export function bareUnit({ text, quantity, inSi, decibelReference }: DisplayUnit): string {
  if (decibelReference !== undefined) return text;
  return units.find((unit) => unit.dimension === quantity && unit.inSi === inSi)?.text ?? text;
}
