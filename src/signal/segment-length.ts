import { hopSamples, segmentsThatFit } from './averaging.ts';
import { effectiveAverages } from './overlap.ts';
import type { WindowName } from './window.ts';

/** Longest segment: 4,194,304 samples. A longer one asks for gigabytes and for recordings of minutes. */
export const longestSegmentSamples = 2 ** 22;

/** Averages that a recording should hold: a danger counts at once only where five segments show it. */
export const advisedAverages = 5;

export interface SegmentSettings {
  readonly window: WindowName;
  readonly overlapPercent: number;
  readonly segmentSamples: number;
  /** Seconds at the start that are left out. */
  readonly skipStartS: number;
}

/** Recordings of one kind, with the settings under which they are averaged. */
export interface RecordingKind extends SegmentSettings {
  readonly sampleRateHz: number;
  readonly durationS: number;
}

/** How segments lie in a recording, and what they are worth. */
export interface SegmentLayout {
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

/** The segments of a recording. */
export function layOutSegments(recording: RecordingKind): SegmentLayout {
  const { window, segmentSamples, overlapPercent, sampleRateHz, durationS, skipStartS } = recording;
  const hop = hopSamples(segmentSamples, overlapPercent);
  const samples = Math.floor((durationS - skipStartS) * sampleRateHz + 1e-6);
  const averages = segmentsThatFit(samples, segmentSamples, hop);
  return {
    sampleRateHz,
    segmentSamples,
    lineSpacingHz: sampleRateHz / segmentSamples,
    hopSamples: hop,
    averages,
    effectiveAverages: averages === 0 ? 0 : effectiveAveragesBrief(window, segmentSamples, hop, averages),
    usedPercent: averages === 0 ? 0 : (((averages - 1) * hop + segmentSamples) / samples) * 100,
  };
}

/**
 * As `effectiveAverages`, for segments of any length. The window's correlation depends on the hop as a share of the
 * segment, so a long segment is judged by a short one of the same share (to 1 part in 4096): millions of samples
 * need no window here.
 */
export function effectiveAveragesBrief(
  window: WindowName,
  segmentSamples: number,
  hop: number,
  averages: number,
): number {
  const scale = Math.max(1, segmentSamples / 4096);
  return effectiveAverages(window, segmentSamples / scale, Math.max(1, Math.round(hop / scale)), averages);
}

/** Seconds of recording that `averages` segments need at an overlap, what is skipped at the start included. */
export function secondsFor(
  averages: number,
  { sampleRateHz, segmentSamples, overlapPercent, skipStartS }: Omit<RecordingKind, 'window' | 'durationS'>,
): number {
  const hop = hopSamples(segmentSamples, overlapPercent);
  return skipStartS + (segmentSamples + (averages - 1) * hop) / sampleRateHz;
}
