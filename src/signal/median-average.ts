import { Kept } from './kept.ts';
import { windowCorrelations } from './overlap.ts';
import type { QuadraticForm } from './quadratic-form.ts';
import { type AveragingShape, type NoiseStatistics, statisticsOf } from './threshold.ts';
import type { WindowName } from './window.ts';

/**
 * Median over the segments, line by line: what the noise is when single segments hold a knock or a passing lorry. Two
 * knocked segments in nine leave it alone, while they make most of the mean. It serves to find peaks over their floor,
 * never for a level: of a tone it reads 9.5 % too much at 3 segments and 19 % at 31, because it is divided by what noise
 * makes of a median.
 *
 * Noise. The densities of K independent segments are exponential about the same mean; their order statistics are sums of
 * independent exponentials, X_(r) = E_1 / K + E_2 / (K - 1) + ... + E_r / (K - r + 1) (Rényi 1953), and half the step
 * from X_(K/2) to the next is E / K for an even K. So the median has the mean
 *     1 / K + 1 / (K - 1) + ... + 1 / ((K + 1) / 2)   for an odd K  (= 1 - 1/2 + 1/3 - ... + 1/K)
 * and that of K - 1 for an even one, exactly. By this the median is divided (as in Allen et al. 2012, appendix B).
 *
 * Overlapped segments are not independent. At 50 %, simulated with 1.5 million lines, the mean of the divided median is
 * too high by 0.7, 0.4, 0.1 % of the power at 3, 7, 31 segments with Hann, under 0.2 % with Blackman and the wider
 * ones; the median over many lines, which a noise floor is made of, is within 0.5 %. With Hamming it would be 1.4, 0.8,
 * 0.2 %, with the rectangular window 7, 4, 1 %, so of theirs every second is taken (`medianStride`). Above 50 % overlap
 * the median is not to be used.
 */
export interface MedianDensity {
  /** One-sided density, (unit of the samples)²/Hz, divided by `medianBias`; NaN throughout without a segment. */
  readonly density: Float64Array;
  /** Segments that the median was taken of. */
  readonly segments: number;
}

/** Largest overlap, percent, at which the division above holds. */
export const mostMedianOverlapPercent = 50;

/**
 * 2 where neighbouring segments are correlated by more than a fifth (rectangular and Hamming windows): every second one
 * is independent, and the false peaks of a search stay at their rate. Else 1.
 */
export function medianStride(window: WindowName, segmentSamples: number, hop: number): 1 | 2 {
  const [, neighbours = 0] = windowCorrelations(window, segmentSamples, hop);
  return neighbours > 0.2 ? 2 : 1;
}

/** Segments kept at most: more would hardly steady a floor, which is a median over many lines besides. */
const mostKept = 127;
/** Memory for the segments of very long ones. */
const keptBytes = 2 ** 26;
const leastKept = 7;

/**
 * Gathers the densities of segments; holds at most 127 of them. When these are full, every second goes, and from then on
 * every second segment is taken, and so on: those kept lie evenly over the recording, and are single segments still.
 */
export class MedianAverage {
  private readonly lineCount: number;
  private readonly most: number;
  private kept: Float64Array[] = [];
  private stride: number;
  private seen = 0;

  /** `stride`: every so many segments one is taken. */
  constructor(lineCount: number, stride = 1) {
    this.lineCount = lineCount;
    this.stride = stride;
    this.most = Math.max(leastKept, Math.min(mostKept, Math.floor(keptBytes / (8 * lineCount))));
  }

  /** The next segment's density; the array may be used again by the caller. */
  add(density: Float64Array): void {
    if (this.seen++ % this.stride !== 0) return;
    if (this.kept.length === this.most) {
      this.kept = this.kept.filter((_, index) => index % 2 === 0);
      this.stride *= 2;
      if ((this.seen - 1) % this.stride !== 0) return;
    }
    this.kept.push(density.slice());
  }

  finish(): MedianDensity {
    const { kept, lineCount } = this;
    const segments = kept.length;
    const density = new Float64Array(lineCount).fill(Number.NaN);
    if (segments === 0) return { density, segments };
    const bias = medianBias(segments);
    const values = new Float64Array(segments);
    const upper = segments >> 1;
    for (let line = 0; line < lineCount; line++) {
      for (let k = 0; k < segments; k++) values[k] = kept[k][line];
      values.sort();
      const middle = segments % 2 === 1 ? values[upper] : 0.5 * (values[upper - 1] + values[upper]);
      density[line] = middle / bias;
    }
    return { density, segments };
  }
}

/**
 * Mean of the median of K unit exponentials. Checked: 1, 1, 5/6, 5/6, 47/60 for K = 1 .. 5; towards ln 2 for many.
 */
export function medianBias(segments: number): number {
  return medianWeights(segments).reduce((sum, weight) => sum + weight, 0);
}

/** A noise line of a divided median over its mean, as a sum of weighted exponentials (see above). */
export function medianNoise(segments: number): QuadraticForm {
  const weights = medianWeights(segments);
  const bias = medianBias(segments);
  return {
    weights: weights.map((weight) => weight / bias),
    shapes: new Float64Array(weights.length).fill(1),
  };
}

const kept = new Kept<string, NoiseStatistics>(32);

/** As `noiseStatistics`, of the lines of a divided median. */
export function medianStatistics(shape: AveragingShape, segments: number): NoiseStatistics {
  const key = `${shape.window} ${shape.segmentSamples} ${segments}`;
  return kept.get(key, () => statisticsOf(shape, medianNoise(segments)));
}

/** Throws a RangeError without a segment. */
function medianWeights(segments: number): Float64Array {
  if (!(segments >= 1)) throw new RangeError(`segments = ${segments}: a median needs at least 1`);
  const rank = Math.ceil(segments / 2);
  const weights = Array.from({ length: rank }, (_, i) => 1 / (segments - i));
  if (segments % 2 === 0) weights.push(1 / segments);
  return Float64Array.from(weights);
}
