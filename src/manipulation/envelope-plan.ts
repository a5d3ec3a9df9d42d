import {
  canDemodulate,
  type DemodulationBand,
  fixedDemodulation,
  highestDemodulatedHz,
  type PointEnvelope,
} from '../config/envelope-settings.ts';
import type { Point } from '../config/site.ts';
import { type AveragedDensity, type AveragingSettings, hopSamples } from '../signal/averaging.ts';
import { EnvelopeAverager, type EnvelopeAveraging, envelopeAveraging } from '../signal/envelope.ts';
import { Kurtogram, type KurtogramResult, type KurtogramSettings } from '../signal/kurtogram.ts';
import { MedianAverage, type MedianDensity, medianStride } from '../signal/median-average.ts';
import { SegmentSpectra } from '../signal/segment-spectra.ts';
import { seriesRate } from './fingerprint.ts';

/** How the envelope of one recording is made. */
export interface EnvelopePlan extends EnvelopeAveraging {
  readonly band: DemodulationBand;
  /** `kurtosis`: the choice that recordings of the point have agreed on. */
  readonly chosen: 'fixed' | 'kurtosis';
  /** Where a band is still looked for; null: it is fixed, or chosen. */
  readonly search: KurtogramSettings | null;
  /** Peaks are looked for in the median over the segments; left out: in their mean. */
  readonly median?: true;
}

/**
 * The envelope of a point's recordings of that rate; null where nothing asks for it, or the rate gives no band.
 * `chosen`: the band that its recordings have agreed on.
 */
export function envelopePlan(
  point: Pick<Point, 'analysis' | 'envelope' | 'mounting' | 'recordings'>,
  sampleRateHz: number | null,
  chosen: DemodulationBand | null,
): EnvelopePlan | null {
  const { envelope, mounting, analysis } = point;
  if (envelope === undefined || sampleRateHz === null) return null;
  // Rates that count as the same have the same band, so that their levels make one series.
  const rateHz = seriesRate(sampleRateHz, point.recordings.sampleRateHz);
  const usesChoice = envelope.choose === 'kurtosis' && chosen !== null && canDemodulate(chosen, rateHz);
  const band = usesChoice ? chosen : fixedDemodulation(envelope, rateHz, mounting);
  if (band === null || !canDemodulate(band, sampleRateHz)) return null;
  const { window, overlapPercent } = analysis;
  const { lineSpacingHz } = envelope;
  const highestHz = Math.min(envelope.highestHz, halfWidthHz(band));
  return {
    ...envelopeAveraging({ ...band, sampleRateHz, highestHz, window, overlapPercent, lineSpacingHz }),
    band,
    chosen: usesChoice ? 'kurtosis' : 'fixed',
    search: envelope.choose === 'fixed' || usesChoice ? null : searchSettings(envelope, rateHz, mounting),
    ...(analysis.averaging === 'median' ? { median: true as const } : {}),
  };
}

/** The envelope of a band says something up to here. */
export function halfWidthHz({ fromHz, toHz }: DemodulationBand): number {
  return (toHz - fromHz) / 2;
}

/** Narrower bands ring longer than shocks a hundredth of a second apart leave quiet between them. */
const narrowestHz = 800;
/** Below, the shaft's own harmonics are what stands out. */
const lowestHz = 500;

/** Where a band is looked for: wide enough for every band of the envelope, and for the faults of the bearings. */
export function searchSettings(
  envelope: PointEnvelope,
  sampleRateHz: number,
  mounting: Point['mounting'],
): KurtogramSettings {
  const highestHz = highestDemodulatedHz(sampleRateHz, mounting);
  const forFaultsHz = Math.min(2 * (envelope.faultsToHz ?? 0), highestHz / 2);
  return {
    sampleRateHz,
    lowestHz: Math.min(lowestHz, highestHz / 16),
    highestHz,
    narrowestHz: Math.max(2 * envelope.highestHz, forFaultsHz, Math.min(narrowestHz, highestHz / 8)),
  };
}

/** What the envelope of one stretch of samples gave. */
export interface EnvelopeResult {
  readonly plan: EnvelopePlan;
  readonly density: AveragedDensity;
  /** Densities of segments or groups of them. */
  readonly segments: SegmentSpectra;
  readonly kurtogram: KurtogramResult | null;
  /** Null where it was not asked for. */
  readonly median: MedianDensity | null;
}

const mostGroups = 128;

/** Envelope of a stretch without gaps, fed in blocks of any size; holds blocks and segments, never the recording. */
export class EnvelopeRun {
  readonly #plan: EnvelopePlan;
  readonly #averager: EnvelopeAverager;
  readonly #segments: SegmentSpectra;
  readonly #kurtogram: Kurtogram | null;
  readonly #median: MedianAverage | null;

  constructor(plan: EnvelopePlan) {
    this.#plan = plan;
    this.#segments = new SegmentSpectra(plan.averaging.segmentSamples / 2 + 1, mostGroups);
    this.#averager = new EnvelopeAverager(plan, (density) => {
      this.#segments.add(density);
      this.#median?.add(density);
    });
    this.#median = plan.median === true ? medianAverage(plan.averaging) : null;
    this.#kurtogram = plan.search === null ? null : new Kurtogram(plan.search);
  }

  add(samples: Float64Array): void {
    this.#averager.add(samples);
    this.#kurtogram?.add(samples);
  }

  finish(): EnvelopeResult {
    return {
      plan: this.#plan,
      density: this.#averager.finish(),
      segments: this.#segments,
      kurtogram: this.#kurtogram?.finish() ?? null,
      median: this.#median?.finish() ?? null,
    };
  }
}

function medianAverage({ window, segmentSamples, overlapPercent }: AveragingSettings): MedianAverage {
  const hop = hopSamples(segmentSamples, overlapPercent);
  return new MedianAverage(segmentSamples / 2 + 1, medianStride(window, segmentSamples, hop));
}
