import { longestSegmentSamples, segmentOf } from '../config/meaning.ts';
import type { Point } from '../config/site.ts';
import type { AveragingSettings } from '../signal/averaging.ts';
import type { LineGrid } from '../signal/band-level.ts';

/** How a point's recordings of this sample rate are averaged; null where they cannot be. */
export function averagingOf(
  { analysis }: Pick<Point, 'analysis'>,
  sampleRateHz: number | null,
): AveragingSettings | null {
  if (sampleRateHz === null) return null;
  const segmentSamples = segmentOf(analysis, sampleRateHz);
  if (segmentSamples < 8 || segmentSamples > longestSegmentSamples) return null;
  const { window, overlapPercent, detrend } = analysis;
  const plain = { window, overlapPercent, segmentSamples, sampleRateHz };
  return detrend === undefined ? plain : { ...plain, detrend };
}

export function gridOf({ sampleRateHz, segmentSamples }: AveragingSettings): LineGrid {
  return { lineSpacingHz: sampleRateHz / segmentSamples, lines: segmentSamples / 2 + 1 };
}
