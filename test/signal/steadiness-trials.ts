import { averageDensity } from '../../src/signal/averaging.ts';
import { findPeaks } from '../../src/signal/peaks.ts';
import { SegmentSpectra } from '../../src/signal/segment-spectra.ts';
import { type Steadiness, steadiness } from '../../src/signal/steadiness.ts';
import type { Trial } from './peak-trials.ts';

/** How steady samples taken at 1 Hz are found. */
export function judge(samples: Float64Array, trial: Trial): Steadiness | null {
  const segments = new SegmentSpectra(trial.segmentSamples / 2 + 1);
  const averaged = averageDensity(samples, { ...trial, sampleRateHz: 1 }, (density) => segments.add(density));
  if (averaged.averages !== trial.averages) throw new Error('the samples do not give the averages meant');
  const settings = { ...trial, sampleRateHz: 1, hopSamples: averaged.hopSamples };
  return steadiness(segments, findPeaks(averaged.density, settings), settings);
}
