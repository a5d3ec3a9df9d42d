import type { WindowName } from '../signal/window.ts';
import type { Delay } from './site.ts';

/** How the spectra of a point are averaged, in SI units; part of the frozen `Site`. */
export interface AnalysisSettings {
  readonly window: WindowName;
  readonly overlapPercent: number;
  readonly lineSpacingHz: number;
  /** Set instead of the line spacing for one-off analysis. */
  readonly segmentSamples: number | null;
  readonly skipStartS: number;
  readonly confidencePercent: number;
  readonly falsePeaksPerSpectrum: number;
  /** What is taken off each segment; left out: its mean. */
  readonly detrend?: 'linear';
  /**
   * What else is made of the segments besides their mean, from which levels always come. `median`: peaks are looked for
   * in it. `peak-hold`: it is the spectrum that people see. Left out: nothing.
   */
  readonly averaging?: 'median' | 'peak-hold';
  /** So many recordings, or those of so long a time, are pooled in one average; left out: each stands by itself. */
  readonly averageOver?: Delay;
}
