import type { QualityFinding } from '../acquisition/recording.ts';
import type { Quantity } from '../config/site.ts';
import type { AveragedDensity, AveragingSettings } from '../signal/averaging.ts';
import type { EnvelopeMeasured } from './envelope-measured.ts';
import type { EnvelopePlan } from './envelope-plan.ts';
import type { Evidence } from './evidence.ts';
import type { SeriesBeside } from './series-beside.ts';

/**
 * What one recording says of one measuring point. Levels are r.m.s. in the SI unit of their quantity
 * (m/s², m/s, m, ...); peaks are the r.m.s. of their sinusoid in the SI unit of the point's quantity.
 * Plain data: it travels between threads and is what the ledger keeps.
 */
export interface Measurement {
  readonly machineId: string;
  readonly pointId: string;
  /** Channel as the file names it. */
  readonly channel: string;
  readonly quantity: Quantity;
  readonly unit: string;
  readonly sampleRateHz: number;
  /** Length of the stretch that was analysed, in seconds. */
  readonly durationS: number;
  readonly speed: MeasuredSpeed | null;
  readonly loadPercent: number | null;
  /** The sidecar's own word; null where it has none. */
  readonly runningSaid: boolean | null;
  readonly waveform: WaveformValues | null;
  /** Null where not even one segment fits. */
  readonly averaging: Averaging | null;
  readonly levels: readonly BandLevel[];
  readonly peaks: readonly SpectralPeak[];
  readonly spectrum: Spectrum | null;
  /** Null or left out: the speed did not move so far that lines smear, or nothing says how it moved. */
  readonly orders?: OrderSpectrum | null;
  /** Null or left out: the point has none, or the recording is too short for it. */
  readonly envelope?: EnvelopeMeasured | null;
  readonly quality: readonly QualityFinding[];
  /** What its lines say of the machine's parts. */
  readonly evidence: readonly Evidence[];
  /** Hash of everything that moves any number of this measurement (settings of the whole point). */
  readonly settingsFingerprint: string;
  /** Series of a neighbouring sample rate that its levels may join; left out: none. */
  readonly seriesBeside?: readonly SeriesBeside[];
  /** What it brings into the average over several recordings; left out where its point does not pool. */
  readonly share?: PoolShare;
  /** It says nothing by itself: its spectrum is in a pool that is still open. */
  readonly waits?: true;
}

/** The mean density of a recording's segments, (SI unit)²/Hz in full precision, for an average over several recordings. */
export interface PoolShare {
  readonly averaging: AveragingSettings;
  readonly density: AveragedDensity;
  /** Null where the point has none, or not one segment of it fitted. */
  readonly envelope: EnvelopeShare | null;
}

export interface EnvelopeShare {
  readonly plan: EnvelopePlan;
  readonly density: AveragedDensity;
}

/** Where a running speed comes from; best first. */
export type SpeedOrigin = 'sidecar' | 'pulses' | 'spectrum' | 'nominal';

export interface RunningSpeed {
  /** Mean over the recording. */
  readonly rpm: number;
  readonly origin: SpeedOrigin;
  /** The true mean speed lies this near in about 95 of 100 recordings. */
  readonly uncertaintyRpm: number;
}

/** A recording's own running speed, with what the recording itself says of it; the ledger keeps a `RunningSpeed`. */
export interface MeasuredSpeed extends RunningSpeed {
  /** False where the recording contradicts a speed that somebody declared: no line may be named by it. */
  readonly usableForNames: boolean;
  /** Slowest and fastest within the recording, from pulses; null where only a mean is known. */
  readonly rangeRpm: { readonly lowest: number; readonly highest: number } | null;
  /** The speed at which the spectra of the machine's points hold a family of shaft harmonics; null: none, or not looked for. */
  readonly inSpectrum: SpeedInSpectrum | null;
}

export interface SpeedInSpectrum {
  readonly rpm: number;
  readonly uncertaintyRpm: number;
  /** Sum over the harmonics of how far each stands out of the noise, dB. */
  readonly score: number;
}

export interface WaveformValues {
  readonly mean: number;
  readonly rms: number;
  readonly peak: number;
  readonly crestFactor: number;
  readonly kurtosis: number;
  readonly skewness: number;
}

export interface Averaging {
  readonly window: string;
  readonly overlapPercent: number;
  readonly segmentSamples: number;
  readonly lineSpacingHz: number;
  /** Segments, of all recordings where several are pooled. */
  readonly averages: number;
  /** Recordings that were pooled; left out: the one. */
  readonly recordings?: number;
  readonly effectiveAverages: number;
  readonly usedPercent: number;
  /** What was taken off each segment; left out: its mean. */
  readonly detrend?: 'linear';
  /** Larger of the two steadiness figures as a ratio to its flag's threshold; null below four averages. */
  readonly segmentSpread: number | null;
}

export interface BandLevel {
  readonly bandId: string;
  /** Identity of the series: hash of what moves this number, and nothing else. */
  readonly fingerprint: string;
  readonly fromHz: number;
  readonly toHz: number;
  readonly quantity: Quantity;
  readonly level: number;
  readonly intervalLow: number;
  readonly intervalHigh: number;
  readonly confidencePercent: number;
  /** Level that 80 % of the segments exceed on their own; null below five averages. Confirms a danger at once. */
  readonly exceededBy80Percent: number | null;
  /** True where clipping or a saturated sensor means that the true level is at least this. */
  readonly atLeast: boolean;
}

export interface SpectralPeak {
  readonly frequencyHz: number;
  readonly level: number;
  readonly aboveFloorDb: number;
  readonly kind: 'tone' | 'hump';
  /** Multiple of the running speed; null without a speed. */
  readonly order: number | null;
  /** What may make the line, in plain words; empty where nothing is known to lie there, or too much. */
  readonly names: readonly string[];
}

/** One-sided density, (SI unit)²/Hz, in single precision: it is kept for people to look at, levels are not made from it. */
export interface Spectrum {
  readonly lineSpacingHz: number;
  readonly density: Float32Array;
  /** The highest that any segment had, for eyes only; left out: the mean of the segments. */
  readonly averaging?: 'peak-hold';
}

/** Spectrum over orders of a shaft whose speed moved, from samples at equal angles; frequencies are those at the mean speed. */
export interface OrderSpectrum {
  readonly meanRpm: number;
  readonly lineSpacingOrders: number;
  readonly averages: number;
  /** One-sided, (SI unit)²/order. */
  readonly density: Float32Array;
  readonly peaks: readonly SpectralPeak[];
}
