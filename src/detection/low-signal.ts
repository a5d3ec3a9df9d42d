import type { QualityFinding } from '../acquisition/recording.ts';

/** Recordings that must stand behind the usual value before anything is called low. */
export const leastGoodRecordings = 5;

/**
 * A signal under a fifth of what the point usually gives while its machine runs: a sensor that has come off, a cable
 * that has let go. The usual value is the median of the last good recordings' r.m.s. while running (a running mean
 * would follow the dead sensor down).
 *
 * @param rms r.m.s. of this recording about its mean, SI unit of the point's quantity
 * @param lastGoodRms the same of unflagged recordings while running, any order, same unit
 * @returns the finding, or null: not low, or fewer than five to go by
 */
export function lowSignal(rms: number, lastGoodRms: readonly number[]): QualityFinding | null {
  const usable = lastGoodRms.filter((one) => Number.isFinite(one) && one > 0).sort((a, b) => a - b);
  if (usable.length < leastGoodRecordings || !Number.isFinite(rms)) return null;
  const middle = usable.length >> 1;
  const upper = usable[middle] as number;
  const median = usable.length % 2 === 1 ? upper : ((usable[middle - 1] as number) + upper) / 2;
  if (rms >= median / 5) return null;
  const percent = ((100 * rms) / median).toPrecision(2);
  return {
    flag: 'low-signal',
    detail: `r.m.s. is ${percent} % of the median of the last ${usable.length} good recordings; 20 % or more expected`,
  };
}
