import { type AveragedDensity, Averager, type AveragingSettings } from '../signal/averaging.ts';
import { bandPower } from '../signal/band-level.ts';
import { MedianAverage, type MedianDensity, medianStride } from '../signal/median-average.ts';
import { PeakHold } from '../signal/peak-hold.ts';
import { SegmentSpectra } from '../signal/segment-spectra.ts';
import { Waveform, type WaveformValues } from '../signal/waveform.ts';
import { type EnvelopePlan, type EnvelopeResult, EnvelopeRun } from './envelope-plan.ts';
import type { LaidBand } from './point-bands.ts';

/** What is to be made of a stretch. */
export interface StretchSettings {
  /** Null: waveform values only. */
  readonly averaging: AveragingSettings | null;
  /** Bands that lie where they lie whatever the running speed is. */
  readonly bands: readonly LaidBand[];
  /** What else is made of the segments besides their mean. */
  readonly besides?: 'median' | 'peak-hold' | undefined;
  /** Null: no envelope. */
  readonly envelope: EnvelopePlan | null;
}

/** What one unbroken stretch of samples gave. */
export interface StretchResult {
  readonly samples: number;
  readonly waveform: WaveformValues;
  /** Null where not one segment fits. */
  readonly density: AveragedDensity | null;
  /** Mean square of each segment by itself, one list a band, in the order of the bands. */
  readonly segmentPowers: readonly (readonly number[])[];
  /** Densities of segments or groups of them; null where there is no density. */
  readonly segments: SegmentSpectra | null;
  /** Null where it was not asked for, or there is no density. */
  readonly median: MedianDensity | null;
  /** The highest that any segment had, as `density`; null likewise. */
  readonly highest: Float64Array | null;
  /** Null likewise. */
  readonly envelope: EnvelopeResult | null;
}

/** Memory for single segments' densities; long segments are grouped sooner. */
const segmentsBytes = 2 ** 25;
const mostGroups = 128;
const leastGroups = 8;

/**
 * Waveform values and averaged density of a stretch without gaps, fed in blocks of any size. Holds samples only
 * until the first segment is full, so that a file which claims more than it has costs no memory.
 *
 * Every analysis of a point's samples lives here: made in the constructor, fed in `add`, read in `finish`. What needs
 * the running speed, which is known only when all channels are read, works from `StretchResult` afterwards.
 */
export class CleanStretch {
  readonly #settings: AveragingSettings | null;
  readonly #bands: readonly LaidBand[];
  readonly #waveform = new Waveform();
  readonly #segmentPowers: number[][];
  readonly #besides: StretchSettings['besides'];
  readonly #plan: EnvelopePlan | null;
  #waiting: Float64Array[] = [];
  #averager: Averager | null = null;
  #segments: SegmentSpectra | null = null;
  #median: MedianAverage | null = null;
  #hold: PeakHold | null = null;
  #envelope: EnvelopeRun | null = null;
  samples = 0;

  constructor({ averaging, bands, besides, envelope }: StretchSettings) {
    this.#plan = envelope;
    this.#settings = averaging;
    this.#besides = besides;
    this.#bands = bands;
    this.#segmentPowers = bands.map(() => []);
  }

  /** The array may be used again by the caller. */
  add(samples: Float64Array): void {
    if (samples.length === 0) return;
    this.samples += samples.length;
    this.#waveform.add(samples);
    if (this.#settings === null) return;
    if (this.#averager !== null) {
      this.#averager.add(samples);
      this.#envelope?.add(samples);
      return;
    }
    this.#waiting.push(samples.slice());
    if (this.samples < this.#settings.segmentSamples) return;
    const { window, segmentSamples } = this.#settings;
    const lines = segmentSamples / 2 + 1;
    this.#segments = segmentSpectra(lines);
    this.#averager = new Averager(this.#settings, (density) => this.#visit(density));
    if (this.#besides === 'median') {
      const stride = medianStride(window, segmentSamples, this.#averager.hopSamples);
      this.#median = new MedianAverage(lines, stride);
    } else if (this.#besides === 'peak-hold') {
      this.#hold = new PeakHold(lines);
    }
    if (this.#plan !== null) this.#envelope = new EnvelopeRun(this.#plan);
    for (const block of this.#waiting) {
      this.#averager.add(block);
      this.#envelope?.add(block);
    }
    this.#waiting = [];
  }

  finish(): StretchResult {
    return {
      samples: this.samples,
      waveform: this.#waveform.finish(),
      density: this.#averager?.finish() ?? null,
      segmentPowers: this.#segmentPowers,
      segments: this.#segments,
      median: this.#median?.finish() ?? null,
      highest: this.#hold?.finish() ?? null,
      envelope: this.#envelope?.finish() ?? null,
    };
  }

  #visit(density: Float64Array): void {
    this.#segments?.add(density);
    this.#median?.add(density);
    this.#hold?.add(density);
    for (const [n, { weights }] of this.#bands.entries()) {
      this.#segmentPowers[n].push(bandPower(density, weights));
    }
  }
}

function segmentSpectra(lines: number): SegmentSpectra {
  const groups = 2 * Math.floor(segmentsBytes / (8 * lines));
  return new SegmentSpectra(lines, Math.max(leastGroups, Math.min(mostGroups, groups)));
}
