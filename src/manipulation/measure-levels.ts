import type { Band, Point } from '../config/site.ts';
import type { AveragedDensity, AveragingSettings } from '../signal/averaging.ts';
import { bandInterval, type IntervalKernel, makeIntervalKernel } from '../signal/band-interval.ts';
import type { BandWeights } from '../signal/band-level.ts';
import { Kept } from '../signal/kept.ts';
import { effectiveAverages } from '../signal/overlap.ts';
import { findPeaks, type Peak, type PeakSearch, type PeakSettings } from '../signal/peaks.ts';
import { type Segments, segmentsKey } from '../signal/pooled-segments.ts';
import type { SegmentSpectra } from '../signal/segment-spectra.ts';
import { steadiness } from '../signal/steadiness.ts';
import type { Averaging, BandLevel, SpectralPeak } from './measurement.ts';
import type { LaidBand } from './point-bands.ts';

/** A density with the peaks that were found in it. */
export interface SearchedDensity {
  readonly density: AveragedDensity;
  readonly settings: PeakSettings;
  readonly search: PeakSearch;
}

/** `averages`: the segments of each recording where several are pooled. */
export function searchPeaks(
  density: AveragedDensity,
  { window, segmentSamples, sampleRateHz }: AveragingSettings,
  {
    falsePeaksPerSpectrum,
    averages = density.averages,
    searchIn,
  }: Pick<PeakSettings, 'falsePeaksPerSpectrum' | 'searchIn'> & { readonly averages?: Segments },
): SearchedDensity {
  const { hopSamples } = density;
  const shape = { window, segmentSamples, hopSamples, averages, sampleRateHz };
  const settings = { ...shape, falsePeaksPerSpectrum, ...(searchIn === undefined ? {} : { searchIn }) };
  return { density, settings, search: findPeaks(density.density, settings) };
}

/** A band on the lines, with its mean square in each segment by itself. */
export interface BandSegments {
  readonly laid: LaidBand;
  readonly segmentPowers: readonly number[];
}

/**
 * Mean squares of a band that could be laid only when all segments were there, from the densities kept of them: of
 * each by itself, or of each group where there are more segments than are kept.
 */
export function groupPowers(segments: SegmentSpectra, { firstLine, weights }: BandWeights): number[] {
  return Array.from({ length: segments.count }, (_, group) => {
    const density = segments.group(group);
    let power = 0;
    for (let i = 0; i < weights.length; i++) power += weights[i] * density[firstLine + i];
    return power;
  });
}

export interface LevelQuestion {
  readonly point: Point;
  readonly averaging: AveragingSettings;
  readonly searched: SearchedDensity;
  readonly segments: SegmentSpectra | null;
  readonly bands: readonly BandSegments[];
  readonly speedHz: number | null;
  /** The true levels are at least these: the recording is clipped or the sensor saturated. */
  readonly atLeast: boolean;
  /** Fingerprint of a band's series. */
  readonly seriesOf: (band: Band) => string;
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
  const { averaging, searched } = question;
  const { density, settings, search } = searched;
  const { window, segmentSamples, overlapPercent } = averaging;
  const { averages, hopSamples } = density;
  const { kernel, effective } = averagesOf(averaging, hopSamples, settings.averages);
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
      ...(averaging.detrend === 'linear' ? { detrend: 'linear' as const } : {}),
      segmentSpread: steady?.segmentSpread ?? null,
    },
    levels: question.bands.map((band) => levelOf(question, band, kernel, tones)),
    peaks: peaks.map((peak) => spectralPeak(peak, question.speedHz)),
    unsteady: steady?.unsteady === true ? steady.detail : null,
  };
}

function levelOf(
  { point, searched, seriesOf, atLeast }: LevelQuestion,
  { laid: { band, fromHz, toHz, weights }, segmentPowers }: BandSegments,
  kernel: IntervalKernel,
  tones: readonly Peak[],
): BandLevel {
  const { confidencePercent } = point.analysis;
  const interval = bandInterval(searched.density.density, weights, kernel, tones, confidencePercent);
  return {
    bandId: band.id,
    fingerprint: seriesOf(band),
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
    names: [],
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

function averagesOf(settings: AveragingSettings, hopSamples: number, averages: Segments): KnownAverages {
  const { window, segmentSamples } = settings;
  return kept.get(`${window} ${segmentSamples} ${hopSamples} ${segmentsKey(averages)}`, () => {
    const scale = Math.max(1, segmentSamples / standInSamples);
    const shortHop = Math.max(1, Math.round(hopSamples / scale));
    return {
      kernel: makeIntervalKernel(window, segmentSamples, hopSamples, averages),
      effective: effectiveAverages(window, segmentSamples / scale, shortHop, averages),
    };
  });
}
