import type { AveragedDensity } from '../signal/averaging.ts';
import type { Spectrum, WaveformValues } from './measurement.ts';

/** What people are shown, in single precision: the mean of the segments, or the highest of them. */
export function shownSpectrum(mean: AveragedDensity, highest: Float64Array | null): Spectrum {
  const { lineSpacingHz } = mean;
  if (highest === null) return { lineSpacingHz, density: Float32Array.from(mean.density) };
  return { lineSpacingHz, density: Float32Array.from(highest), averaging: 'peak-hold' };
}

/** A flat signal has no shape: crest factor, kurtosis and skewness are given as 0, so that no NaN is stored. */
export function plainWaveform(values: WaveformValues): WaveformValues {
  const plain = (value: number) => (Number.isFinite(value) ? value : 0);
  return {
    ...values,
    crestFactor: plain(values.crestFactor),
    kurtosis: plain(values.kurtosis),
    skewness: plain(values.skewness),
  };
}
