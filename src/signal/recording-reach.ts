import { type IntervalKernel, makeIntervalKernel } from './band-interval.ts';
import { bandWeights } from './band-level.ts';
import type { Integrations } from './integration.ts';
import { bandUncertainty, type LevelUncertainty, lineUncertainty } from './level-uncertainty.ts';
import { layOutSegments, type RecordingKind, type SegmentLayout } from './segment-length.ts';
import { toneSeparation } from './tone-separation.ts';
import { leastBandLines } from './window.ts';

/** What a recording can and cannot show. */

/** Analysers end their range at rate / 2.56: a convention that leaves the anti-aliasing filter its room. */
export const rateOverHighest = 2.56;
/** Lines to the running speed that naming a peak after a machine part needs. */
export const linesForNames = 25;
/** Turns of the slowest shaft that a segment should hold at the least. */
export const leastTurns = 10;
/** An envelope's band should be so many times as wide as the fastest repetition that is to show in it. */
const envelopeWidthOverRepetition = 5;

export interface AskedBand {
  readonly fromHz: number;
  readonly toHz: number;
  readonly integrations: Integrations;
}

export interface ReachQuestion {
  readonly confidencePercent: number;
  readonly bands: readonly AskedBand[];
  /** Up to where the sensor as it is fixed reads flat; null: not known. */
  readonly mountingHz: number | null;
  /** The slowest shaft; null: not known. */
  readonly slowestHz: number | null;
  /** The band that is demodulated. */
  readonly envelope: { readonly fromHz: number; readonly toHz: number };
}

export interface BandReach {
  /** Null: not to be had, or not one segment fits. */
  readonly level: LevelUncertainty | null;
  /** Why it is not to be had; null: it is. */
  readonly hindrance: 'too-low' | 'too-narrow' | 'too-high' | null;
}

export interface RecordingReach {
  readonly layout: SegmentLayout;
  /** Highest edge of a band, and what bounds it. */
  readonly highestHz: number;
  readonly highestBy: 'sample rate' | 'mounting';
  readonly narrowestBandHz: number;
  /** Lowest edge of a velocity or displacement band that is integrated; any other may begin at half a line. */
  readonly lowestIntegratedHz: number;
  /** Smallest distance of two tones that are told apart; null: none is far enough, the window hides the weaker one. */
  readonly equalTonesHz: number | null;
  /** One of them 20 dB below the other. */
  readonly unequalTonesHz: number | null;
  /** Null: not one segment fits. */
  readonly line: LevelUncertainty | null;
  /** By the order in which they were asked. */
  readonly bands: readonly BandReach[];
  /** Turns of the slowest shaft in a segment. */
  readonly turns: number | null;
  /** Slowest shaft whose peaks can be named after machine parts, Hz. */
  readonly leastNamedHz: number;
  /** Slowest repetition of a fault that has a line of its own, clear of 0 Hz. */
  readonly slowestRepetitionHz: number;
  /** Fastest repetition whose impacts an envelope still tells apart; null: the band to demodulate is out of reach. */
  readonly fastestRepetitionHz: number | null;
}

/** What recordings of one kind can show. Bands are judged for noise that is even before integration. */
export function recordingReach(recording: RecordingKind, question: ReachQuestion): RecordingReach {
  const layout = layOutSegments(recording);
  const { lineSpacingHz } = layout;
  const { mountingHz, slowestHz, envelope, confidencePercent } = question;
  const byRate = recording.sampleRateHz / rateOverHighest;
  const highestHz = Math.min(byRate, mountingHz ?? byRate);
  const apart = toneSeparation(recording.window);
  const widthHz = Math.min(envelope.toHz, highestHz) - envelope.fromHz;
  const least = leastBandLines(recording.window) * lineSpacingHz;
  const kernel = layout.averages === 0 ? null : kernelOf(recording, layout);
  return {
    layout,
    highestHz,
    highestBy: highestHz < byRate ? 'mounting' : 'sample rate',
    narrowestBandHz: least,
    lowestIntegratedHz: least,
    equalTonesHz: apart && apart.equalLines * lineSpacingHz,
    unequalTonesHz: apart && apart.unequalLines * lineSpacingHz,
    line: layout.averages === 0 ? null : lineUncertainty(layout.effectiveAverages, confidencePercent),
    bands: question.bands.map((band) => {
      const hindrance = hindranceOf(band, least, byRate);
      const hindered = hindrance !== null || kernel === null;
      return { level: hindered ? null : bandLevelReach(band, layout, kernel, confidencePercent), hindrance };
    }),
    turns: slowestHz === null ? null : slowestHz / lineSpacingHz,
    leastNamedHz: linesForNames * lineSpacingHz,
    slowestRepetitionHz: least,
    fastestRepetitionHz: widthHz > 0 ? widthHz / envelopeWidthOverRepetition : null,
  };
}

function kernelOf({ window }: RecordingKind, layout: SegmentLayout): IntervalKernel {
  return makeIntervalKernel(window, layout.segmentSamples, layout.hopSamples, layout.averages);
}

/** An edge that is right to the last digit is right. */
const rounding = 1e-9;

function hindranceOf(
  { fromHz, toHz, integrations }: AskedBand,
  leastHz: number,
  highestHz: number,
): BandReach['hindrance'] {
  if (toHz > highestHz * (1 + rounding)) return 'too-high';
  if (integrations > 0 && fromHz < leastHz * (1 - rounding)) return 'too-low';
  return toHz - fromHz < leastHz * (1 - rounding) ? 'too-narrow' : null;
}

/** How well the band's level is known; null where it has no line, or reaches beyond the spectrum. */
export function bandLevelReach(
  { fromHz, toHz, integrations }: AskedBand,
  { lineSpacingHz, segmentSamples }: Pick<SegmentLayout, 'lineSpacingHz' | 'segmentSamples'>,
  kernel: IntervalKernel,
  confidencePercent: number,
): LevelUncertainty | null {
  const laid = bandWeights(fromHz, toHz, { lineSpacingHz, lines: segmentSamples / 2 + 1 }, integrations);
  return 'refused' in laid ? null : bandUncertainty(laid.weights, kernel, confidencePercent);
}
