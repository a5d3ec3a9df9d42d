import { type AveragedDensity, Averager, type AveragingSettings, type SegmentVisitor } from './averaging.ts';
import { type Demodulation, type DemodulationSettings, Demodulator, demodulationOf } from './demodulation.ts';
import { secondsFor, segmentSamplesFor } from './segment-length.ts';
import type { WindowName } from './window.ts';

export interface EnvelopeSettings extends DemodulationSettings {
  readonly window: WindowName;
  readonly overlapPercent: number;
  /** Widest distance between two lines of the envelope's spectrum: at most 1/25 of the shaft speed tells faults apart. */
  readonly lineSpacingHz: number;
}

export interface EnvelopeAveraging {
  readonly demodulation: Demodulation;
  /** Of the envelope, at its own rate. */
  readonly averaging: AveragingSettings;
}

/**
 * How an envelope is made and averaged: the segment is the smallest power of two whose line spacing is not wider than
 * asked, at least 8. 25.6 kHz, 2 to 8 kHz, 2 Hz: 4096 values at 6.4 kHz.
 * Throws a RangeError on a band that cannot be demodulated.
 */
export function envelopeAveraging(settings: EnvelopeSettings): EnvelopeAveraging {
  const { window, overlapPercent, lineSpacingHz } = settings;
  const demodulation = demodulationOf(settings);
  const sampleRateHz = demodulation.envelopeRateHz;
  const segmentSamples = Math.max(8, segmentSamplesFor(sampleRateHz, lineSpacingHz));
  return { demodulation, averaging: { window, overlapPercent, segmentSamples, sampleRateHz } };
}

/** Seconds of recording that so many segments of an envelope take, the filter's ringing at both ends included. */
export function secondsForEnvelope({ demodulation, averaging }: EnvelopeAveraging, segments: number): number {
  const endsS = (2 * demodulation.edgeSamples) / (demodulation.envelopeRateHz * demodulation.decimation);
  return secondsFor(segments, { ...averaging, skipStartS: endsS });
}

/**
 * Spectrum of the envelope of one band: overlap-averaged one-sided density, (unit of the samples)²/Hz, the mean of each
 * segment removed. A line of amplitude m in (1 + m cos Ωt) cos ωt reads m² / 2 at Ω. Fed in blocks of any size, finite
 * numbers; holds two blocks and two segments, never the recording.
 */
export class EnvelopeAverager {
  private readonly demodulator: Demodulator;
  private readonly averager: Averager;

  constructor({ demodulation, averaging }: EnvelopeAveraging, visitor?: SegmentVisitor) {
    this.averager = new Averager(averaging, visitor);
    const sampleRateHz = demodulation.envelopeRateHz * demodulation.decimation;
    this.demodulator = new Demodulator(demodulation, sampleRateHz, (values) => this.averager.add(values));
  }

  add(samples: Float64Array): void {
    this.demodulator.add(samples);
  }

  /** `averages` 0: not one segment fitted. Nothing can be added afterwards. */
  finish(): AveragedDensity {
    this.demodulator.finish();
    return this.averager.finish();
  }
}
