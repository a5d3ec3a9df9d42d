/**
 * Bands of a long recording by overlapping blocks: two blocks of real samples share one large transform, a band's
 * lines are weighted and shifted down to 0, and a smaller transform gives the band's complex envelope at a lower rate.
 *
 * Filtering by transforms wraps round: what lies at one end of a block reaches into the other as far as the filter
 * rings. So both ends are left out. A filter with vertical edges rings like 1 / n and never ends; here each edge is a
 * smooth step, the integral of the four-term Blackman-Harris window, so that the ringing falls below -92 dB of
 * its 1 / n within four cycles of the step's width: `ringingSamples`.
 */
import { ComplexTransform, isPowerOfTwo } from './transform.ts';
import { windowCoefficients } from './window.ts';

/** Edges half-way up at `fromHz` and `toHz`, each `edgeHz` wide; 0: vertical. */
export interface BandShape {
  readonly fromHz: number;
  readonly toHz: number;
  readonly edgeHz: number;
}

/** Samples after which the band's filter has rung out: four cycles of its edges' width. Vertical edges: never, taken as 0. */
export function ringingSamples({ edgeHz }: Pick<BandShape, 'edgeHz'>, sampleRateHz: number): number {
  return edgeHz === 0 ? 0 : Math.ceil((4 * sampleRateHz) / edgeHz);
}

/** What the filter lets through at a frequency, 0 to 1. A vertical edge belongs to the band. */
export function bandAmplitude({ fromHz, toHz, edgeHz }: BandShape, hz: number): number {
  if (edgeHz === 0) return hz >= fromHz && hz <= toHz ? 1 : 0;
  return smoothStep((hz - fromHz) / edgeHz + 0.5) * smoothStep((toHz - hz) / edgeHz + 0.5);
}

const [a0, ...higher] = windowCoefficients('blackman-harris');

/** Integral of the Blackman-Harris window from 0 to x, 1 at x = 1. */
function smoothStep(x: number): number {
  if (x <= 0) return 0;
  if (x >= 1) return 1;
  let sum = x;
  let sign = -1;
  for (const [index, coefficient] of higher.entries()) {
    const turns = 2 * Math.PI * (index + 1);
    sum += ((sign * coefficient) / a0) * (Math.sin(turns * x) / turns);
    sign = -sign;
  }
  return sum;
}

export interface BlockSize {
  /** Samples of a block: a power of two, at most 2^20. */
  readonly blockSamples: number;
  /** Samples left out at both ends of each. */
  readonly edgeSamples: number;
}

export const longestBlock = 2 ** 20;

/**
 * Sees two neighbouring blocks as one complex spectrum (the first in the real, the second in the imaginary parts of the
 * samples), with how many samples of each, from `edgeSamples` on, are good: none of the second at the end, perhaps.
 */
export type BlockVisitor = (spectrum: Float64Array, good: readonly [number, number]) => void;

/**
 * Cuts a recording that is fed in blocks of any size into overlapping ones. Every sample but `edgeSamples` at the
 * beginning and at the end is a good one of exactly one block. Holds two blocks, never the recording.
 */
export class BandBlocks {
  readonly size: BlockSize;
  /** Good samples of a block. */
  readonly hop: number;
  private readonly visitor: BlockVisitor;
  private readonly transform: ComplexTransform;
  private readonly pair: Float64Array;
  private filled = 0;

  /** Throws a RangeError on a block that is no power of two up to 2^20, or not longer than its ends. */
  constructor(size: BlockSize, visitor: BlockVisitor) {
    const { blockSamples, edgeSamples } = size;
    if (!isPowerOfTwo(blockSamples) || blockSamples > longestBlock || blockSamples <= 2 * edgeSamples) {
      throw new RangeError(
        `blockSamples = ${blockSamples}: must be a power of two up to 2^20, above ${2 * edgeSamples}`,
      );
    }
    this.size = size;
    this.hop = blockSamples - 2 * edgeSamples;
    this.visitor = visitor;
    this.transform = new ComplexTransform(blockSamples);
    this.pair = new Float64Array(blockSamples + this.hop);
  }

  /** Takes the next samples, finite numbers; the array may be used again by the caller. */
  add(samples: Float64Array): void {
    const { pair, hop } = this;
    for (let taken = 0; taken < samples.length; ) {
      const part = Math.min(samples.length - taken, pair.length - this.filled);
      pair.set(samples.subarray(taken, taken + part), this.filled);
      this.filled += part;
      taken += part;
      if (this.filled < pair.length) return;
      this.take(hop, hop);
      pair.copyWithin(0, 2 * hop);
      this.filled -= 2 * hop;
    }
  }

  /** Takes what is left. */
  finish(): void {
    const { hop, filled } = this;
    const left = Math.max(0, filled - 2 * this.size.edgeSamples);
    if (left === 0) return;
    this.pair.fill(0, filled);
    this.take(Math.min(hop, left), Math.min(hop, Math.max(0, left - hop)));
    this.filled = 0;
  }

  private take(first: number, second: number): void {
    const { pair, hop } = this;
    const { input, length } = this.transform;
    for (let n = 0; n < length; n++) {
      input[2 * n] = pair[n];
      input[2 * n + 1] = pair[n + hop];
    }
    this.visitor(this.transform.run(), [first, second]);
  }
}

/** Takes one band out of the spectrum of two blocks. */
export class BasebandBand {
  /** One value of the envelope for so many samples; a power of two. */
  readonly decimation: number;
  private readonly blockSamples: number;
  private readonly firstLine: number;
  private readonly weights: Float64Array;
  private readonly transform: ComplexTransform;

  /** Throws a RangeError where the band does not fit below half the sample rate, or not into the lower rate. */
  constructor(shape: BandShape, sampleRateHz: number, blockSamples: number, decimation: number) {
    const { fromHz, toHz, edgeHz } = shape;
    const spacing = sampleRateHz / blockSamples;
    const first = Math.max(1, Math.ceil((fromHz - edgeHz / 2) / spacing));
    const last = Math.floor((toHz + edgeHz / 2) / spacing);
    if (!(last < blockSamples / 2 && last >= first)) {
      throw new RangeError(`band from ${fromHz} to ${toHz} Hz does not fit below half of ${sampleRateHz} Hz`);
    }
    if (last - first + 1 > blockSamples / decimation) {
      throw new RangeError(
        `band from ${fromHz} to ${toHz} Hz is wider than the rate ${sampleRateHz / decimation} Hz`,
      );
    }
    this.blockSamples = blockSamples;
    this.decimation = decimation;
    this.firstLine = first;
    this.transform = new ComplexTransform(blockSamples / decimation);
    this.weights = Float64Array.from(
      { length: last - first + 1 },
      (_, i) => bandAmplitude(shape, (first + i) * spacing) / blockSamples,
    );
  }

  /** Weights of the band's lines, 0 to 1. */
  get amplitudes(): Float64Array {
    return this.weights.map((weight) => weight * this.blockSamples);
  }

  /**
   * Complex envelope of the first (0) or second (1) block, real and imaginary parts in turn, one value every
   * `decimation` samples from the block's begin on; its magnitude is that of the band's analytic signal. Good until the
   * next call.
   */
  envelope(spectrum: Float64Array, block: 0 | 1): Float64Array {
    const { weights, firstLine } = this;
    const { input } = this.transform;
    const mirror = 2 * (this.blockSamples - firstLine);
    let at = 2 * firstLine;
    // The symmetry of real spectra takes the blocks apart. Each value enters conjugated: its forward transform is then the
    // conjugate of the inverse one.
    if (block === 0) {
      for (let i = 0; i < weights.length; i++, at += 2) {
        const other = mirror - 2 * i;
        input[2 * i] = weights[i] * (spectrum[at] + spectrum[other]);
        input[2 * i + 1] = weights[i] * (spectrum[other + 1] - spectrum[at + 1]);
      }
    } else {
      for (let i = 0; i < weights.length; i++, at += 2) {
        const other = mirror - 2 * i;
        input[2 * i] = weights[i] * (spectrum[at + 1] + spectrum[other + 1]);
        input[2 * i + 1] = weights[i] * (spectrum[at] - spectrum[other]);
      }
    }
    return this.transform.run();
  }
}
