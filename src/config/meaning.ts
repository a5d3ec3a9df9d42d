import {
  layOutSegments,
  longestSegmentSamples,
  type SegmentLayout,
  secondsFor,
  segmentSamplesFor,
} from '../signal/segment-length.ts';
import type { AnalysisSettings, Point } from './site.ts';

export { longestSegmentSamples, secondsFor, segmentSamplesFor };

/** What a point's settings amount to for a recording of so many samples. */
export type AveragingMeaning = SegmentLayout;

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
  const { window, overlapPercent, skipStartS } = analysis;
  const segmentSamples = segmentOf(analysis, sampleRateHz);
  return layOutSegments({ window, overlapPercent, segmentSamples, skipStartS, sampleRateHz, durationS });
}

/** For the point's configured rate and duration; null where the site file leaves either to the recording. */
export function pointMeaning({ analysis, recordings }: Point): AveragingMeaning | null {
  const { sampleRateHz, durationS } = recordings;
  return sampleRateHz === null || durationS === null
    ? null
    : averagingMeaning(analysis, sampleRateHz, durationS);
}

/** Recordings that are pooled in one average: 1 where each stands by itself. Of a time: as many as are expected in it. */
export function poolSizeOf({ averageOver }: AnalysisSettings, expectedEveryMs: number): number {
  if (averageOver === undefined) return 1;
  return 'recordings' in averageOver ? averageOver.recordings : Math.round(averageOver.ms / expectedEveryMs);
}

/** How often a level of the point arrives: with each recording, or with each pool that is full. */
export function levelEveryMs({ analysis, recordings }: Pick<Point, 'analysis' | 'recordings'>): number {
  return Math.max(1, poolSizeOf(analysis, recordings.expectedEveryMs)) * recordings.expectedEveryMs;
}
