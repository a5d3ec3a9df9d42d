import type { Band, Point } from '../config/site.ts';
import type { AveragedDensity } from '../signal/averaging.ts';
import type { KurtogramResult } from '../signal/kurtogram.ts';
import type { MedianDensity } from '../signal/median-average.ts';
import type { Segments } from '../signal/pooled-segments.ts';
import type { SegmentSpectra } from '../signal/segment-spectra.ts';
import type { EnvelopeCandidate, EnvelopeMeasured } from './envelope-measured.ts';
import { type EnvelopePlan, halfWidthHz } from './envelope-plan.ts';
import { groupPowers, levelsOf, searchPeaks } from './measure-levels.ts';
import type { BandLevel } from './measurement.ts';
import { gridOf } from './point-averaging.ts';
import { layEnvelopeBands, type UnlaidBand } from './point-bands.ts';

export interface EnvelopeQuestion {
  readonly point: Point;
  readonly plan: EnvelopePlan;
  readonly density: AveragedDensity;
  /** Segments averaged; those of each recording where several are pooled. */
  readonly averages: Segments;
  /** Null: no single segment is judged. */
  readonly segments: SegmentSpectra | null;
  readonly kurtogram: KurtogramResult | null;
  /** Where peaks are looked for; null: in `density`. */
  readonly median: MedianDensity | null;
  readonly speedHz: number | null;
  readonly atLeast: boolean;
  /** Fingerprint of a band's series. */
  readonly seriesOf: (band: Band) => string;
}

export interface MeasuredEnvelope {
  readonly envelope: EnvelopeMeasured;
  readonly levels: readonly BandLevel[];
  readonly unlaid: readonly UnlaidBand[];
}

/** Levels, peaks and spectrum of an envelope; null where not one segment of it fitted. */
export function measureEnvelope(question: EnvelopeQuestion): MeasuredEnvelope | null {
  const { point, plan, density, averages, segments, speedHz } = question;
  if (density.averages === 0) return null;
  const { averaging, band, chosen } = plan;
  const { falsePeaksPerSpectrum } = point.analysis;
  const searchIn = question.median === null ? {} : { searchIn: question.median };
  const searched = searchPeaks(density, averaging, { falsePeaksPerSpectrum, averages, ...searchIn });
  const highestHz = halfWidthHz(band);
  const { laid, unlaid } = layEnvelopeBands(point, gridOf(averaging), speedHz, highestHz);
  const measured = levelsOf({
    point,
    averaging,
    searched,
    segments: null,
    bands: laid.map((one) => ({
      laid: one,
      segmentPowers: segments === null ? [] : groupPowers(segments, one.weights),
    })),
    speedHz,
    atLeast: question.atLeast,
    seriesOf: question.seriesOf,
  });
  const lines = Math.min(density.density.length, Math.floor(highestHz / density.lineSpacingHz) + 1);
  return {
    envelope: {
      fromHz: band.fromHz,
      toHz: band.toHz,
      chosen,
      lineSpacingHz: density.lineSpacingHz,
      averaging: measured.averaging,
      peaks: measured.peaks.filter(({ frequencyHz }) => frequencyHz <= highestHz),
      spectrum: {
        lineSpacingHz: density.lineSpacingHz,
        density: Float32Array.from(density.density.subarray(0, lines)),
      },
      candidate: candidateOf(question.kurtogram),
    },
    levels: measured.levels,
    unlaid,
  };
}

function candidateOf(kurtogram: KurtogramResult | null): EnvelopeCandidate | null {
  if (kurtogram?.best == null) return null;
  const { fromHz, toHz, kurtosis, noisePoint } = kurtogram.best;
  return { fromHz, toHz, kurtosis, noisePoint, passes: kurtogram.passes };
}

/** Why no band of the envelope has a level: the recording's rate gives no envelope, or it is too short for one. */
export function noEnvelope({ bands }: Pick<Point, 'bands'>, plan: EnvelopePlan | null): UnlaidBand[] {
  return bands
    .filter(({ of }) => of === 'envelope')
    .map((band) => ({
      band,
      flag: plan === null ? 'wrong-rate' : 'too-short',
      reason:
        plan === null
          ? `no level of band ${band.id}: the recording's sample rate is too low for the envelope`
          : `no level of band ${band.id}: the recording is too short for the envelope; record longer`,
    }));
}
