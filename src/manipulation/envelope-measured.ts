import type { Averaging, SpectralPeak, Spectrum } from './measurement.ts';

/** What one recording says in the envelope of its high-frequency band. Peaks and density in the unit of the point. */
export interface EnvelopeMeasured {
  /** The band that was demodulated; its envelope says something up to half its width. */
  readonly fromHz: number;
  readonly toHz: number;
  /** `kurtosis`: the band that recordings of the point have agreed on; else the site file's, or the usual one. */
  readonly chosen: 'fixed' | 'kurtosis';
  readonly lineSpacingHz: number;
  /** Segment and averages are those of the envelope, at its own rate. */
  readonly averaging: Averaging;
  readonly peaks: readonly SpectralPeak[];
  /** Up to half the width of the band. */
  readonly spectrum: Spectrum;
  /** The band in which shocks stood out most; null: not looked for, or the recording is too short to tell. */
  readonly candidate: EnvelopeCandidate | null;
}

export interface EnvelopeCandidate {
  readonly fromHz: number;
  readonly toHz: number;
  /** 0 in nothing but noise. */
  readonly kurtosis: number;
  /** What one recording of noise in a thousand exceeds. */
  readonly noisePoint: number;
  readonly passes: boolean;
}
