import type { AveragedDensity } from './averaging.ts';

/**
 * Average over the segments of several recordings: each density counts by its averages. The densities lie on the same
 * lines and have the same hop; of a spectrum or of an envelope. Throws a RangeError where they do not, or without any.
 */
export function poolDensities(recordings: readonly AveragedDensity[]): AveragedDensity {
  const first = recordings[0];
  if (first === undefined) throw new RangeError('nothing to pool');
  const density = new Float64Array(first.density.length);
  let [averages, samples, reached] = [0, 0, 0];
  for (const one of recordings) {
    if (one.density.length !== density.length || one.lineSpacingHz !== first.lineSpacingHz) {
      throw new RangeError(`densities of ${density.length} and ${one.density.length} lines cannot be pooled`);
    }
    if (one.hopSamples !== first.hopSamples) {
      throw new RangeError(
        `segments ${first.hopSamples} and ${one.hopSamples} samples apart cannot be pooled`,
      );
    }
    samples += one.samples;
    reached += (one.usedPercent / 100) * one.samples;
    averages += one.averages;
    if (one.averages === 0) continue;
    for (let k = 0; k < density.length; k++) density[k] += one.averages * one.density[k];
  }
  return {
    ...first,
    density: density.map((sum) => (averages === 0 ? Number.NaN : sum / averages)),
    averages,
    samples,
    usedPercent: samples === 0 ? 0 : (100 * reached) / samples,
  };
}
