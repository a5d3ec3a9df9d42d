import { type LevelUncertainty, lineUncertainty } from './level-uncertainty.ts';
import { layOutSegments, type RecordingKind } from './segment-length.ts';
import type { WindowName } from './window.ts';

/** What a recording's averages are worth at one overlap. */
export interface OverlapRow {
  readonly overlapPercent: number;
  readonly averages: number;
  readonly effectiveAverages: number;
  /** Of a single line of noise. */
  readonly line: LevelUncertainty;
  /** Worth in percent of the most that any overlap gives. */
  readonly shareOfMostPercent: number;
  /** The segments added since less overlap only repeat data: together they are worth not 2 % more. */
  readonly repeats: boolean;
}

const usualOverlaps: readonly number[] = [0, 25, 50, 200 / 3, 75, 90, 95];
const leastGain = 1.02;

/**
 * The recording's averages over overlaps from 0 to 95 %, its own among them. Empty where not one segment fits.
 * Checked: Hann, 20 segment lengths: 20, 26, 39, 58, 77, 191, 381 averages are worth 20.0, 26.0, 37.0, 40.3, 40.3,
 * 40.0, 39.9 (Welch 1967): from 75 % on they repeat data.
 */
export function overlapGain(recording: RecordingKind, confidencePercent: number): OverlapRow[] {
  const own = recording.overlapPercent;
  const near = (overlap: number) => Math.abs(overlap - own) < 1;
  const overlaps = [...usualOverlaps.filter((overlap) => !near(overlap)), own].sort((a, b) => a - b);
  const layouts = overlaps.map((overlapPercent) => layOutSegments({ ...recording, overlapPercent }));
  if (layouts.some(({ averages }) => averages === 0)) return [];
  const most = Math.max(...layouts.map(({ effectiveAverages }) => effectiveAverages));
  let before = { averages: Number.POSITIVE_INFINITY, worth: 0 };
  return layouts.map(({ averages, effectiveAverages }, n) => {
    const repeats = averages > before.averages && effectiveAverages < leastGain * before.worth;
    before = { averages, worth: Math.max(before.worth, effectiveAverages) };
    return {
      overlapPercent: overlaps[n] as number,
      averages,
      effectiveAverages,
      line: lineUncertainty(effectiveAverages, confidencePercent),
      shareOfMostPercent: (100 * effectiveAverages) / most,
      repeats,
    };
  });
}

/** Overlap at which a window's segments weigh the samples most evenly for the little they repeat (Heinzel, Rüdiger & Schilling 2002, section 10). */
const recommended: Readonly<Record<WindowName, number>> = {
  rectangular: 0,
  hann: 50,
  hamming: 50,
  blackman: 60,
  'blackman-harris': 66,
  'flat-top': 75,
};

export function recommendedOverlap(window: WindowName): number {
  return recommended[window];
}
