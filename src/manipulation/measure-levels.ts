import type { Point } from '../config/site.ts';
import type { AveragedDensity, AveragingSettings } from '../signal/averaging.ts';
import { bandInterval, type IntervalKernel, makeIntervalKernel } from '../signal/band-interval.ts';
import { Kept } from '../signal/kept.ts';
import { effectiveAverages } from '../signal/overlap.ts';
import { findPeaks, type Peak } from '../signal/peaks.ts';
import type { SegmentSpectra } from '../signal/segment-spectra.ts';
import { steadiness } from '../signal/steadiness.ts';
import { type FingerprintSettings, seriesFingerprint } from './fingerprint.ts';
import type { Averaging, BandLevel, SpectralPeak } from './measurement.ts';
import type { LaidBand } from './point-bands.ts';

export interface LevelQuestion {
  readonly point: Point;
  readonly averaging: AveragingSettings;
  readonly density: AveragedDensity;
  readonly segmentPowers: readonly (readonly number[])[];
  readonly segments: SegmentSpectra | null;
  readonly bands: readonly LaidBand[];
  readonly speedHz: number | null;
  /** The true levels are at least these: the recording is clipped or the sensor saturated. */
  readonly atLeast: boolean;
  readonly fingerprint: FingerprintSettings;
}

export interface MeasuredLevels {
  readonly averaging: Averaging;
  readonly levels: readonly BandLevel[];
  readonly peaks: readonly SpectralPeak[];
  /** What varied from segment to segment, in words; null: steady, or too few averages to say. */
  readonly unsteady: string | null;
}

/** Band levels with their intervals, peaks with their orders, and how they were averaged. */
export function levelsOf(question: LevelQuestion): MeasuredLevels {
  const { point, averaging, density } = question;
  const { window, segmentSamples, overlapPercent, sampleRateHz } = averaging;
  const { averages, hopSamples } = density;
  const { kernel, effective } = averagesOf(averaging, hopSamples, averages);
  const { falsePeaksPerSpectrum } = point.analysis;
  const settings = { window, segmentSamples, hopSamples, averages, sampleRateHz, falsePeaksPerSpectrum };
  const search = findPeaks(density.density, settings);
  const { peaks } = search;
  const steady = question.segments && steadiness(question.segments, search, settings);
  const tones = peaks.filter((peak) => peak.kind === 'tone');
  return {
    averaging: {
      window,
      overlapPercent,
      segmentSamples,
      lineSpacingHz: density.lineSpacingHz,
      averages,
      effectiveAverages: effective,
      usedPercent: density.usedPercent,
      segmentSpread: steady?.segmentSpread ?? null,
    },
    levels: question.bands.map((laid, n) =>
      levelOf(question, laid, question.segmentPowers[n], kernel, tones),
    ),
    peaks: peaks.map((peak) => spectralPeak(peak, question.speedHz)),
    unsteady: steady?.unsteady === true ? steady.detail : null,
  };
}

function levelOf(
  { point, density, fingerprint, atLeast }: LevelQuestion,
  { band, fromHz, toHz, weights }: LaidBand,
  segmentPowers: readonly number[],
  kernel: IntervalKernel,
  tones: readonly Peak[],
): BandLevel {
  const { confidencePercent } = point.analysis;
  const interval = bandInterval(density.density, weights, kernel, tones, confidencePercent);
  return {
    bandId: band.id,
    fingerprint: seriesFingerprint(fingerprint, band),
    fromHz,
    toHz,
    quantity: band.quantity,
    level: interval.level,
    intervalLow: interval.low,
    intervalHigh: interval.high,
    confidencePercent,
    exceededBy80Percent: exceededBy80Percent(segmentPowers),
    atLeast,
  };
}

/** Fewest averages of which a share of 80 % can be told. */
const leastForShare = 5;

/** The largest segment level at or above which at least 80 % of the segments lie; null below five. */
export function exceededBy80Percent(segmentPowers: readonly number[]): number | null {
  if (segmentPowers.length < leastForShare) return null;
  const sorted = Float64Array.from(segmentPowers).sort();
  return Math.sqrt(sorted[Math.floor(0.2 * sorted.length + 1e-9)]);
}

function spectralPeak(peak: Peak, speedHz: number | null): SpectralPeak {
  return {
    frequencyHz: peak.frequencyHz,
    level: peak.level,
    aboveFloorDb: peak.aboveFloorDb,
    kind: peak.kind,
    order: speedHz ? peak.frequencyHz / speedHz : null,
  };
}

interface KnownAverages {
  readonly kernel: IntervalKernel;
  readonly effective: number;
}

/** Both depend on the settings alone and cost more than a recording's levels; a site has a handful of settings. */
const kept = new Kept<string, KnownAverages>(32);

/** The window's correlation depends on the hop as a share of the segment; a long segment is stood for by this one. */
const standInSamples = 4096;

function averagesOf(settings: AveragingSettings, hopSamples: number, averages: number): KnownAverages {
  const { window, segmentSamples } = settings;
  return kept.get(`${window} ${segmentSamples} ${hopSamples} ${averages}`, () => {
    const scale = Math.max(1, segmentSamples / standInSamples);
    const shortHop = Math.max(1, Math.round(hopSamples / scale));
    return {
      kernel: makeIntervalKernel(window, segmentSamples, hopSamples, averages),
      effective: effectiveAverages(window, segmentSamples / scale, shortHop, averages),
    };
  });
}
