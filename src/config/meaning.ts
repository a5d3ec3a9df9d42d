import { hopSamples, segmentsThatFit } from '../signal/averaging.ts';
import { effectiveAverages } from '../signal/overlap.ts';
import type { WindowName } from '../signal/window.ts';
import type { AnalysisSettings, Point } from './site.ts';

/** Longest segment: 4,194,304 samples. A longer one asks for gigabytes and for recordings of minutes. */
export const longestSegmentSamples = 2 ** 22;

/** What a point's settings amount to for a recording of so many samples. */
export interface AveragingMeaning {
  readonly sampleRateHz: number;
  readonly segmentSamples: number;
  readonly lineSpacingHz: number;
  readonly hopSamples: number;
  /** Segments that fit. 0: the recording is too short for one. */
  readonly averages: number;
  /** Independent averages that the overlapped ones are worth. */
  readonly effectiveAverages: number;
  /** Part of the recording that some segment reaches. */
  readonly usedPercent: number;
}

/**
 * Smallest power of two whose line spacing is not wider than asked: 25.6 kHz at 1.6 Hz gives 16384 (1.5625 Hz).
 * At least 2.
 */
export function segmentSamplesFor(sampleRateHz: number, lineSpacingHz: number): number {
  let samples = 2;
  while (sampleRateHz / samples > lineSpacingHz) samples *= 2;
  return samples;
}

/** Line spacing where the site file names none: 1.6 Hz, 0.8 Hz below 1200 rpm, 0.4 Hz below 600 rpm. */
export function usualLineSpacingHz(runningSpeedHz: number | null): number {
  if (runningSpeedHz === null || runningSpeedHz >= 20) return 1.6;
  return runningSpeedHz >= 10 ? 0.8 : 0.4;
}

/** Segment of a point at a sample rate: the one its settings name, else the one its line spacing needs. */
export function segmentOf(analysis: AnalysisSettings, sampleRateHz: number): number {
  return analysis.segmentSamples ?? segmentSamplesFor(sampleRateHz, analysis.lineSpacingHz);
}

/** Segment, line spacing, hop and averages for a recording of `durationS` seconds at a sample rate. */
export function averagingMeaning(
  analysis: AnalysisSettings,
  sampleRateHz: number,
  durationS: number,
): AveragingMeaning {
  const segmentSamples = segmentOf(analysis, sampleRateHz);
  const hop = hopSamples(segmentSamples, analysis.overlapPercent);
  const samples = Math.floor((durationS - analysis.skipStartS) * sampleRateHz + 1e-6);
  const averages = segmentsThatFit(samples, segmentSamples, hop);
  return {
    sampleRateHz,
    segmentSamples,
    lineSpacingHz: sampleRateHz / segmentSamples,
    hopSamples: hop,
    averages,
    effectiveAverages: averages === 0 ? 0 : effectiveOf(analysis.window, segmentSamples, hop, averages),
    usedPercent: averages === 0 ? 0 : (((averages - 1) * hop + segmentSamples) / samples) * 100,
  };
}

/** For the point's configured rate and duration; null where the site file leaves either to the recording. */
export function pointMeaning({ analysis, recordings }: Point): AveragingMeaning | null {
  const { sampleRateHz, durationS } = recordings;
  return sampleRateHz === null || durationS === null
    ? null
    : averagingMeaning(analysis, sampleRateHz, durationS);
}

/**
 * The window's correlation depends on the hop as a share of the segment, so a long segment is judged by a short one
 * of the same share (to 1 part in 4096): a site file cannot ask for a window of millions of samples here.
 */
function effectiveOf(window: WindowName, segmentSamples: number, hop: number, averages: number): number {
  const scale = Math.max(1, segmentSamples / 4096);
  return effectiveAverages(window, segmentSamples / scale, Math.max(1, Math.round(hop / scale)), averages);
}

/** Seconds of recording that `averages` segments need at an overlap, what is skipped at the start included. */
export function secondsFor(
  averages: number,
  {
    sampleRateHz,
    segmentSamples,
    overlapPercent,
    skipStartS,
  }: {
    readonly sampleRateHz: number;
    readonly segmentSamples: number;
    readonly overlapPercent: number;
    readonly skipStartS: number;
  },
): number {
  const hop = hopSamples(segmentSamples, overlapPercent);
  return skipStartS + (segmentSamples + (averages - 1) * hop) / sampleRateHz;
}
