import { hopSamples } from './averaging.ts';
import { makeIntervalKernel } from './band-interval.ts';
import { degreesFor } from './level-uncertainty.ts';
import { recommendedOverlap } from './overlap-gain.ts';
import { type AskedBand, bandLevelReach, linesForNames, rateOverHighest } from './recording-reach.ts';
import {
  advisedAverages,
  effectiveAveragesBrief,
  layOutSegments,
  longestSegmentSamples,
  type RecordingKind,
  type SegmentLayout,
  secondsFor,
  segmentSamplesFor,
} from './segment-length.ts';
import { toneSeparation } from './tone-separation.ts';
import { leastBandLines, type WindowName } from './window.ts';

/** What a recording is to show. Null: nothing is asked of that. */
export interface RecordingWish {
  readonly lineSpacingHz: number | null;
  /** Two tones that are to be told apart, the weaker one up to 20 dB below the other. */
  readonly separate: { readonly lowHz: number; readonly highHz: number } | null;
  /** Levels are to be known to within plus or minus `db` in so many percent of recordings. */
  readonly confidence: { readonly db: number; readonly percent: number } | null;
  /** Bands that are to be had; where there are any, the confidence is asked of their levels, else of a single line. */
  readonly bands: readonly AskedBand[];
  readonly slowestHz: number | null;
  readonly highestHz: number | null;
  /** The logger's; null: the lowest usual one that reaches the highest frequency. */
  readonly sampleRateHz: number | null;
  readonly window: WindowName;
  /** Null: what suits the window. */
  readonly overlapPercent: number | null;
  readonly skipStartS: number;
}

/** What the line spacing had to be narrow enough for. */
export type SpacingReason = 'asked' | 'separate' | 'band' | 'names' | 'usual';

export interface RecordingPlan {
  readonly recording: RecordingKind;
  readonly layout: SegmentLayout;
  /** Widest line spacing that does it. */
  readonly widestSpacingHz: number;
  readonly spacingFor: SpacingReason;
}

export interface PlanRefusal {
  readonly refused: 'window' | 'rate' | 'segment' | 'length';
  /** What cannot be had, and what would do, for people. */
  readonly reason: string;
}

/** Rates of loggers are 2.56 times a round frequency. */
const roundFrequencies: readonly number[] = [1, 2, 4, 5, 8];
const usualHighestHz = 10_000;
const usualSpacingHz = 1.6;
/** Averages for a line's level where no confidence is asked (common practice: 16 to 30). */
const usualEffectiveAverages = 16;
const longestRecordingS = 86_400;

/**
 * The shortest recording that shows what is wished: rate, segment (a power of two), overlap and length, rounded up to a
 * length that one would set. Fed back to `recordingReach` it meets the wish.
 */
export function planRecording(wish: RecordingWish): RecordingPlan | PlanRefusal {
  const sampleRateHz = wish.sampleRateHz ?? usualRate(wish);
  const refusal = refuseRate(wish, sampleRateHz);
  if (refusal !== null) return refusal;
  const spacing = spacingFor(wish);
  if ('refused' in spacing) return spacing;
  const segmentSamples = Math.max(8, segmentSamplesFor(sampleRateHz, spacing.widestHz));
  if (segmentSamples > longestSegmentSamples) {
    const finest = sampleRateHz / longestSegmentSamples;
    return {
      refused: 'segment',
      reason: `a line every ${figures(spacing.widestHz)} Hz at ${figures(sampleRateHz)} Hz needs segments of ${segmentSamples} samples, at most ${longestSegmentSamples} are possible (a line every ${figures(finest)} Hz); record at a lower rate or ask for less`,
    };
  }
  const { window, skipStartS } = wish;
  const overlapPercent = wish.overlapPercent ?? recommendedOverlap(window);
  const shape = { window, segmentSamples, overlapPercent, skipStartS, sampleRateHz };
  const averages = averagesFor(wish, shape);
  const seconds = averages === null ? Number.POSITIVE_INFINITY : secondsFor(averages, shape);
  if (seconds > longestRecordingS) {
    return {
      refused: 'length',
      reason: 'that needs recordings of more than a day; ask for less confidence or a wider line spacing',
    };
  }
  const recording = { ...shape, durationS: handyLength(seconds) };
  return {
    recording,
    layout: layOutSegments(recording),
    widestSpacingHz: spacing.widestHz,
    spacingFor: spacing.reason,
  };
}

function highestAsked({ highestHz, bands, separate }: RecordingWish): number {
  return Math.max(highestHz ?? 0, separate?.highHz ?? 0, ...bands.map(({ toHz }) => toHz));
}

function usualRate(wish: RecordingWish): number {
  const highest = highestAsked(wish);
  // Two tones that are to be told apart say nothing of what else is to be seen.
  const open = wish.highestHz === null && wish.bands.length === 0;
  return rateFor(open ? Math.max(highest, usualHighestHz) : highest);
}

/** Lowest usual rate of 2.56 times the highest frequency at least. Checked: 10 kHz: 25.6 kHz; 3 kHz: 10.24 kHz. */
export function rateFor(highestHz: number): number {
  const decade = 10 ** Math.floor(Math.log10(highestHz));
  const round = [...roundFrequencies, 10].find((step) => step * decade >= highestHz * (1 - 1e-9)) ?? 10;
  return Number((round * decade * rateOverHighest).toPrecision(9));
}

function refuseRate(wish: RecordingWish, sampleRateHz: number): PlanRefusal | null {
  const highest = highestAsked(wish);
  if (highest <= (sampleRateHz / rateOverHighest) * (1 + 1e-9)) return null;
  return {
    refused: 'rate',
    reason: `${figures(sampleRateHz)} Hz reaches up to ${figures(sampleRateHz / rateOverHighest)} Hz (rate / ${rateOverHighest}), ${figures(highest)} Hz is asked for; record at ${figures(rateFor(highest))} Hz`,
  };
}

/** The narrowest of what is asked; the slowest shaft decides where nothing else does. */
function spacingFor(
  wish: RecordingWish,
): { readonly widestHz: number; readonly reason: SpacingReason } | PlanRefusal {
  const { window, separate, bands, lineSpacingHz, slowestHz } = wish;
  const asked: { readonly widestHz: number; readonly reason: SpacingReason }[] = [];
  if (lineSpacingHz !== null) asked.push({ widestHz: lineSpacingHz, reason: 'asked' });
  if (separate !== null) {
    const apart = toneSeparation(window);
    if (apart === null) {
      return {
        refused: 'window',
        reason: `the ${window} window tells no two tones apart for certain: its side lobes hide the weaker one; use hann`,
      };
    }
    asked.push({ widestHz: (separate.highHz - separate.lowHz) / apart.unequalLines, reason: 'separate' });
  }
  if (asked.length === 0) {
    asked.push(
      slowestHz === null
        ? { widestHz: usualSpacingHz, reason: 'usual' }
        : { widestHz: slowestHz / linesForNames, reason: 'names' },
    );
  }
  const lines = leastBandLines(window);
  for (const { fromHz, toHz, integrations } of bands) {
    const width = integrations === 0 ? toHz - fromHz : Math.min(fromHz, toHz - fromHz);
    if (width > 0) asked.push({ widestHz: width / lines, reason: 'band' });
  }
  return asked.reduce((best, one) => (one.widestHz < best.widestHz ? one : best));
}

type Shape = Omit<RecordingKind, 'durationS'>;

/** Fewest averages that give the confidence; null: more than a day of them. */
function averagesFor(wish: RecordingWish, shape: Shape): number | null {
  const suffices = confidenceTest(wish, shape);
  const most = Math.ceil((longestRecordingS * shape.sampleRateHz) / hopOf(shape));
  let [few, many] = [advisedAverages - 1, advisedAverages];
  while (!suffices(many)) {
    if (many > most) return null;
    [few, many] = [many, 2 * many];
  }
  while (many - few > 1) {
    const middle = Math.floor((few + many) / 2);
    if (suffices(middle)) many = middle;
    else few = middle;
  }
  return many;
}

function confidenceTest(wish: RecordingWish, shape: Shape): (averages: number) => boolean {
  const { confidence, bands } = wish;
  const hop = hopOf(shape);
  const { window, segmentSamples, sampleRateHz } = shape;
  const effective = (averages: number) => effectiveAveragesBrief(window, segmentSamples, hop, averages);
  if (confidence === null) return (averages) => effective(averages) >= usualEffectiveAverages;
  const degrees = degreesFor(confidence.db, confidence.percent);
  if (bands.length === 0) return (averages) => 2 * effective(averages) >= degrees;
  const lineSpacingHz = sampleRateHz / segmentSamples;
  return (averages) => {
    const kernel = makeIntervalKernel(window, segmentSamples, hop, averages);
    return bands.every((band) => {
      const reach = bandLevelReach(band, { lineSpacingHz, segmentSamples }, kernel, confidence.percent);
      return reach === null || reach.highDb <= confidence.db;
    });
  };
}

function hopOf({ segmentSamples, overlapPercent }: Shape): number {
  return hopSamples(segmentSamples, overlapPercent);
}

/** Rounded up to a length that one would set on a logger. Checked: 3.84 s: 4 s; 46.2 s: 47 s; 132 s: 140 s. */
export function handyLength(seconds: number): number {
  const step = seconds < 1 ? 0.05 : seconds < 10 ? 0.5 : seconds < 60 ? 1 : seconds < 600 ? 10 : 60;
  return Number((Math.ceil(seconds / step - 1e-9) * step).toPrecision(6));
}

function figures(value: number): string {
  return String(Number(value.toPrecision(6)));
}
