import { atLeast } from './families.ts';
import { type FreeLines, toleranceLines } from './standing-lines.ts';

/**
 * A finer comb of which the family is only a part: the harmonics of something that turns more slowly (a shaft that
 * nobody listed, or this one at another speed than was thought). Its fundamental in Hz; null where there is none.
 * `own`: frequencies of the same part, which are no foreign ones.
 */
export function finerComb(
  free: FreeLines,
  hz: number,
  sidebandHz: number | null,
  own: readonly number[] = [],
): number | null {
  const toleranceHz = toleranceLines * free.lineSpacingHz;
  for (let part = 2; part <= finestPart; part++) {
    const step = hz / part;
    if (step < 8 * free.lineSpacingHz) return null;
    if (own.some((known) => Math.abs(known - step) < ownTolerance * known)) continue;
    const isOfFamilyAt = (at: number) => isOfFamily(at, hz, sidebandHz, 2 * toleranceHz);
    if (finerReaches.some((reach) => standsAsComb(free, step, reach * part, isOfFamilyAt))) return step;
  }
  return null;
}

/** Up to so many of the family's harmonics the lines between are looked at: a shaft may hide some of the first. */
const finerReaches = [3, 5];

function standsAsComb(
  free: FreeLines,
  step: number,
  below: number,
  isOfFamilyAt: (hz: number) => boolean,
): boolean {
  const toleranceHz = toleranceLines * free.lineSpacingHz;
  const rung = free.rungs.length - 1;
  const chances: number[] = [];
  let met = 0;
  for (let harmonic = 1; harmonic < below; harmonic++) {
    const at = harmonic * step;
    if (isOfFamilyAt(at) || !free.isFree(at)) continue;
    chances.push(free.chanceAt(rung, at, toleranceHz));
    if (free.rankAt(at, toleranceHz) >= 0) met++;
  }
  return met >= 3 && met >= 0.4 * chances.length && atLeast(chances, met) < 0.001;
}

/** A family may be every second to every twenty-fourth line of a finer comb: eight turns, in thirds. */
const finestPart = 24;
const ownTolerance = 0.03;

/** Whether a harmonic of the family, or one of its first three sidebands on either side, lies there. */
function isOfFamily(at: number, hz: number, sidebandHz: number | null, toleranceHz: number): boolean {
  const distance = Math.abs(at - Math.round(at / hz) * hz);
  if (distance <= toleranceHz) return true;
  if (sidebandHz === null) return false;
  return [distance, hz - distance].some((one) => {
    const nearest = Math.round(one / sidebandHz);
    return nearest <= 3 && Math.abs(one - nearest * sidebandHz) <= toleranceHz;
  });
}
