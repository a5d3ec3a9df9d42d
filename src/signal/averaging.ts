import { isPowerOfTwo, PairTransform } from './transform.ts';
import { type SharedWindow, sharedWindow, type WindowName } from './window.ts';

export interface AveragingSettings {
  readonly window: WindowName;
  /** Samples of a segment: a power of two, at least 8. */
  readonly segmentSamples: number;
  /** Overlap of neighbouring segments in percent of the segment, 0 to 95. */
  readonly overlapPercent: number;
  readonly sampleRateHz: number;
  /** What is taken off each segment before the window: its mean (default), or its straight line of least squares. */
  readonly detrend?: Detrend;
}

export type Detrend = 'mean' | 'linear';

export interface AveragedDensity {
  /** One-sided density, (unit of the samples)²/Hz, lines 0 .. segmentSamples / 2; NaN throughout where `averages` is 0. */
  readonly density: Float64Array;
  /** Segments that fitted. 0: the recording is shorter than one segment. */
  readonly averages: number;
  /** Share of the samples that some segment reached, percent. */
  readonly usedPercent: number;
  /** Samples that were fed. */
  readonly samples: number;
  /** Samples from the start of one segment to the start of the next. */
  readonly hopSamples: number;
  readonly lineSpacingHz: number;
}

/**
 * Sees every segment's own one-sided density, in order. The array is lent for the call and overwritten afterwards:
 * copy what must outlive it.
 */
export type SegmentVisitor = (density: Float64Array, segmentIndex: number) => void;

/** Samples between the starts of neighbouring segments: the nearest whole number (a half rounds up), at least 1. */
export function hopSamples(segmentSamples: number, overlapPercent: number): number {
  return Math.max(1, Math.round((segmentSamples * (100 - overlapPercent)) / 100));
}

/** Segments that fit into so many samples. */
export function segmentsThatFit(samples: number, segmentSamples: number, hop: number): number {
  return samples < segmentSamples ? 0 : Math.floor((samples - segmentSamples) / hop) + 1;
}

/**
 * Overlap-averaged density (Welch 1967) of a recording that is fed in blocks of any size; keeps two segments, never
 * the recording, and gives bit for bit the same whatever the size of the blocks.
 *
 * Each segment has its mean removed (or its straight line, see `slopeOf`), is windowed and transformed; its one-sided
 * density is c |X[k]|² / (fs sum w²), c = 2, but 1 at lines 0 and N / 2, which have no mirror image. Two segments share
 * one complex transform.
 *
 * The samples are finite numbers: a NaN would spread over every line of the average.
 */
export class Averager {
  readonly settings: AveragingSettings;
  readonly hopSamples: number;
  private readonly visitor: SegmentVisitor | undefined;
  private readonly window: SharedWindow;
  private readonly transform: PairTransform;
  /** Factor from |X|² to the one-sided density of an inner line. */
  private readonly scale: number;
  private readonly sum: Float64Array;
  /** The newest samples, `filled` of them: the beginning of the next two segments, the second one hop on. */
  private readonly pair: Float64Array;
  private filled = 0;
  private segments = 0;
  private samples = 0;
  private finished = false;

  /** Throws a RangeError on settings outside the bounds stated with them. */
  constructor(settings: AveragingSettings, visitor?: SegmentVisitor) {
    checkSettings(settings);
    const { segmentSamples, overlapPercent, sampleRateHz } = settings;
    this.settings = settings;
    this.visitor = visitor;
    this.hopSamples = hopSamples(segmentSamples, overlapPercent);
    this.window = sharedWindow(settings.window, segmentSamples);
    this.transform = new PairTransform(segmentSamples);
    this.scale = 2 / (sampleRateHz * this.window.power);
    this.sum = new Float64Array(segmentSamples / 2 + 1);
    this.pair = new Float64Array(segmentSamples + this.hopSamples);
  }

  /** Takes the next samples of the recording; the block may be reused by the caller afterwards. */
  add(block: Float64Array): void {
    if (this.finished) throw new Error('samples added to an average that is finished');
    const { pair, hopSamples: hop } = this;
    let taken = 0;
    while (taken < block.length) {
      const part = Math.min(block.length - taken, pair.length - this.filled);
      pair.set(block.subarray(taken, taken + part), this.filled);
      this.filled += part;
      taken += part;
      if (this.filled < pair.length) break;
      this.takePair();
      pair.copyWithin(0, 2 * hop);
      this.filled -= 2 * hop;
    }
    this.samples += block.length;
  }

  /** The average over all segments that fitted. Ends the average: nothing can be added afterwards. */
  finish(): AveragedDensity {
    if (this.finished) throw new Error('an average can be finished only once');
    this.finished = true;
    const { segmentSamples, sampleRateHz } = this.settings;
    if (this.filled >= segmentSamples) this.takeLast();
    const { segments, samples, sum } = this;
    const reached = segments === 0 ? 0 : segmentSamples + (segments - 1) * this.hopSamples;
    return {
      density: sum.map((total) => (segments === 0 ? Number.NaN : total / segments)),
      averages: segments,
      usedPercent: samples === 0 ? 0 : (100 * reached) / samples,
      samples,
      hopSamples: this.hopSamples,
      lineSpacingHz: sampleRateHz / segmentSamples,
    };
  }

  /** Sends two full segments through one transform. */
  private takePair(): void {
    const { pair, hopSamples: hop } = this;
    const { values: window } = this.window;
    const { packed, firstPower, secondPower } = this.transform;
    const length = window.length;
    const firstMean = meanOf(pair, 0, length);
    const secondMean = meanOf(pair, hop, length);
    for (let n = 0; n < length; n++) {
      packed[2 * n] = (pair[n] - firstMean) * window[n];
      packed[2 * n + 1] = (pair[n + hop] - secondMean) * window[n];
    }
    if (this.settings.detrend === 'linear') {
      this.removeSlope(0, slopeOf(pair, 0, length, firstMean));
      this.removeSlope(1, slopeOf(pair, hop, length, secondMean));
    }
    this.transform.run();
    this.include(firstPower);
    this.include(secondPower);
  }

  /** The last segment has no partner. */
  private takeLast(): void {
    const { pair } = this;
    const { values: window } = this.window;
    const { packed, firstPower } = this.transform;
    const mean = meanOf(pair, 0, window.length);
    packed.fill(0);
    for (let n = 0; n < window.length; n++) packed[2 * n] = (pair[n] - mean) * window[n];
    if (this.settings.detrend === 'linear') this.removeSlope(0, slopeOf(pair, 0, window.length, mean));
    this.transform.run();
    this.include(firstPower);
  }

  /** Takes the windowed straight line through the middle of a segment off one side of the packed input. */
  private removeSlope(side: 0 | 1, slope: number): void {
    const { values: window } = this.window;
    const { packed } = this.transform;
    const middle = 0.5 * (window.length - 1);
    for (let n = 0; n < window.length; n++) packed[2 * n + side] -= slope * (n - middle) * window[n];
  }

  /** Turns |X|² into the one-sided density in place, adds it to the sum and shows it to the visitor. */
  private include(power: Float64Array): void {
    const { sum, scale } = this;
    const last = power.length - 1;
    power[0] *= 0.5;
    power[last] *= 0.5;
    for (let k = 0; k <= last; k++) {
      const density = power[k] * scale;
      power[k] = density;
      sum[k] += density;
    }
    this.visitor?.(power, this.segments);
    this.segments++;
  }
}

/** The averaged density of samples that are at hand as a whole; as `Averager`, fed once. */
export function averageDensity(
  samples: Float64Array,
  settings: AveragingSettings,
  visitor?: SegmentVisitor,
): AveragedDensity {
  const averager = new Averager(settings, visitor);
  averager.add(samples);
  return averager.finish();
}

/** In four sums side by side: one addition need not wait for the one before. `length` is a multiple of four. */
function meanOf(samples: Float64Array, from: number, length: number): number {
  let a = 0;
  let b = 0;
  let c = 0;
  let d = 0;
  for (let n = from; n < from + length; n += 4) {
    a += samples[n];
    b += samples[n + 1];
    c += samples[n + 2];
    d += samples[n + 3];
  }
  return (a + b + (c + d)) / length;
}

/**
 * Slope of the straight line of least squares through a segment, per sample: sum t x / sum t² with t = n - (N - 1) / 2,
 * sum t² = N (N² - 1) / 12. The line passes through the mean at the segment's middle.
 */
function slopeOf(samples: Float64Array, from: number, length: number, mean: number): number {
  const middle = 0.5 * (length - 1);
  let sum = 0;
  for (let n = 0; n < length; n++) sum += (n - middle) * (samples[from + n] - mean);
  return (12 * sum) / (length * (length * length - 1));
}

function checkSettings({ segmentSamples, overlapPercent, sampleRateHz }: AveragingSettings): void {
  if (!isPowerOfTwo(segmentSamples) || segmentSamples < 8) {
    throw new RangeError(`segmentSamples = ${segmentSamples}: must be a power of two, at least 8`);
  }
  if (!(overlapPercent >= 0 && overlapPercent <= 95)) {
    throw new RangeError(`overlapPercent = ${overlapPercent}: must lie between 0 and 95`);
  }
  if (!(sampleRateHz > 0 && sampleRateHz < Number.POSITIVE_INFINITY)) {
    throw new RangeError(`sampleRateHz = ${sampleRateHz}: must be positive`);
  }
}
