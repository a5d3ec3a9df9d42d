import { isPowerOfTwo, PairTransform } from './transform.ts';
import { makeWindow, type WindowName } from './window.ts';

export interface AveragingSettings {
  readonly window: WindowName;
  /** Samples of a segment: a power of two, at least 8. */
  readonly segmentSamples: number;
  /** Overlap of neighbouring segments in percent of the segment, 0 to 95. */
  readonly overlapPercent: number;
  readonly sampleRateHz: number;
}

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
 * Overlap-averaged density (Welch 1967) of a recording that is fed in blocks of any size; keeps one segment, never
 * the recording, and gives bit for bit the same whatever the size of the blocks.
 *
 * Each segment has its mean removed, is windowed and transformed; its one-sided density is c |X[k]|² / (fs sum w²),
 * c = 2, but 1 at lines 0 and N / 2, which have no mirror image. Two segments share one complex transform.
 *
 * The samples are finite numbers: a NaN would spread over every line of the average.
 */
export class Averager {
  readonly settings: AveragingSettings;
  readonly hopSamples: number;
  private readonly visitor: SegmentVisitor | undefined;
  private readonly window: Float64Array;
  private readonly transform: PairTransform;
  /** Factor from |X|² to the one-sided density of an inner line. */
  private readonly scale: number;
  private readonly sum: Float64Array;
  /** The newest samples, `filled` of them: the beginning of the next segment. */
  private readonly segment: Float64Array;
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
    this.window = makeWindow(settings.window, segmentSamples);
    this.transform = new PairTransform(segmentSamples);
    this.scale = 2 / (sampleRateHz * this.window.reduce((sum, w) => sum + w * w, 0));
    this.sum = new Float64Array(segmentSamples / 2 + 1);
    this.segment = new Float64Array(segmentSamples);
  }

  /** Takes the next samples of the recording; the block may be reused by the caller afterwards. */
  add(block: Float64Array): void {
    if (this.finished) throw new Error('samples added to an average that is finished');
    const { segment, hopSamples: hop } = this;
    let taken = 0;
    while (taken < block.length) {
      const part = Math.min(block.length - taken, segment.length - this.filled);
      segment.set(block.subarray(taken, taken + part), this.filled);
      this.filled += part;
      taken += part;
      if (this.filled < segment.length) break;
      this.takeSegment();
      segment.copyWithin(0, hop);
      this.filled -= hop;
    }
    this.samples += block.length;
  }

  /** The average over all segments that fitted. Ends the average: nothing can be added afterwards. */
  finish(): AveragedDensity {
    if (this.finished) throw new Error('an average can be finished only once');
    this.finished = true;
    if (this.segments % 2 === 1) {
      // The last segment has no partner; what the one before left would move its last bits.
      const { packed } = this.transform;
      for (let n = 1; n < packed.length; n += 2) packed[n] = 0;
      this.transform.run();
      this.include(this.transform.firstPower, this.segments - 1);
    }
    const { segments, samples, sum } = this;
    const { segmentSamples, sampleRateHz } = this.settings;
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

  /** Packs the full segment beside its neighbour; every second one sends the pair through the transform. */
  private takeSegment(): void {
    const { segment, window } = this;
    const { packed } = this.transform;
    const length = segment.length;
    const side = this.segments % 2;
    let sum = 0;
    for (let n = 0; n < length; n++) sum += segment[n];
    const mean = sum / length;
    for (let n = 0; n < length; n++) packed[2 * n + side] = (segment[n] - mean) * window[n];
    this.segments++;
    if (side === 0) return;
    this.transform.run();
    this.include(this.transform.firstPower, this.segments - 2);
    this.include(this.transform.secondPower, this.segments - 1);
  }

  /** Turns |X|² into the one-sided density in place, adds it to the sum and shows it to the visitor. */
  private include(power: Float64Array, segmentIndex: number): void {
    const { sum, scale } = this;
    const last = power.length - 1;
    for (let k = 1; k < last; k++) power[k] *= scale;
    power[0] *= 0.5 * scale;
    power[last] *= 0.5 * scale;
    for (let k = 0; k <= last; k++) sum[k] += power[k];
    this.visitor?.(power, segmentIndex);
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
