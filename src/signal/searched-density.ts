import { type NoiseFloor, noiseFloor } from './floor.ts';
import { type MedianDensity, medianBias, medianStatistics } from './median-average.ts';
import { type AveragingShape, type NoiseStatistics, noiseStatistics } from './threshold.ts';

/** A density in which peaks are looked for. */
export interface Searched {
  readonly density: Float64Array;
  readonly noise: NoiseFloor;
  readonly statistics: NoiseStatistics;
  /** What the amplitude of a tone reads in it over what it is. */
  readonly toneGain: number;
}

export function searchedMean(density: Float64Array, shape: AveragingShape, perLine: number): Searched {
  const noise = noiseFloor(density, shape, perLine);
  return { density, noise, statistics: noiseStatistics(shape), toneGain: 1 };
}

/** The median of a tone is the tone: divided by what noise makes of a median, it reads too high. */
export function searchedMedian(
  { density, segments }: MedianDensity,
  shape: AveragingShape,
  perLine: number,
): Searched {
  const statistics = medianStatistics(shape, segments);
  const noise = noiseFloor(density, shape, perLine, statistics);
  return { density, noise, statistics, toneGain: 1 / Math.sqrt(medianBias(segments)) };
}
