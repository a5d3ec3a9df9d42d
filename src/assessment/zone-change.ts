import { significantPart } from '../config/zone-limits.ts';
import type { ZoneBoundaries } from '../config/zone-tables.ts';

/** A level against an earlier one of the same point, direction and operating condition; all SI r.m.s. */
export interface ZoneChange {
  /** Level less reference: negative where it fell. */
  readonly by: number;
  readonly reference: number;
  /** 25 % of B/C. */
  readonly threshold: number;
  readonly significant: boolean;
}

/**
 * Criterion II of ISO 10816-1 and -3 (5.3): a change of more than 25 % of the B/C boundary is significant and worth
 * finding out about, up or down, whatever the zone. Null where either level is no number.
 * Checked: group 2 rigid (B/C 2.8 mm/s): 1.0 -> 1.71 and 2.0 -> 1.29 are significant, 1.0 -> 1.69 is not.
 */
export function zoneChange(
  level: number,
  reference: number,
  { bc }: Pick<ZoneBoundaries, 'bc'>,
): ZoneChange | null {
  if (!Number.isFinite(level) || !Number.isFinite(reference)) return null;
  const by = level - reference;
  const threshold = significantPart * bc;
  // Exactly at the threshold is not more than it, whatever the last bit of a difference says.
  return { by, reference, threshold, significant: Math.abs(by) > threshold * (1 + 1e-9) };
}
