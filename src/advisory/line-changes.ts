import type { SpectralPeak } from '../manipulation/measurement.ts';
import type { LineFacts } from './facts.ts';

/** A line rose when its level grew by more than this: 3 dB, well above what a steady line's level varies. */
export const roseRatio = Math.SQRT2;

export interface PeaksAt {
  readonly peaks: readonly SpectralPeak[];
  /** Hz. */
  readonly lineSpacingHz: number;
}

/**
 * The lines of two spectra of one point, paired. Two peaks are one line when they are within a line of each other,
 * or, where both know the running speed, within 1 % of the same order: shaft lines move with the speed. Each line is
 * used once, nearest first. Strongest lines first (the larger of now and then), at most `most`.
 */
export function compareLines(now: PeaksAt, before: PeaksAt, most = 8): LineFacts[] {
  const toleranceHz = Math.max(now.lineSpacingHz, before.lineSpacingHz);
  const pairs = now.peaks
    .flatMap((peak, i) =>
      before.peaks.map((earlier, j) => ({
        i,
        j,
        distance: distanceInTolerances(peak, earlier, toleranceHz),
      })),
    )
    .filter(({ distance }) => distance <= 1)
    .sort((a, b) => a.distance - b.distance || a.i - b.i || a.j - b.j);
  const earlierOf = new Map<number, number>();
  const taken = new Set<number>();
  for (const { i, j } of pairs) {
    if (earlierOf.has(i) || taken.has(j)) continue;
    earlierOf.set(i, j);
    taken.add(j);
  }
  const lines: LineFacts[] = now.peaks.map((peak, i) => {
    const j = earlierOf.get(i);
    return {
      frequencyHz: peak.frequencyHz,
      order: peak.order,
      names: peak.names,
      level: peak.level,
      levelBefore: j === undefined ? null : (before.peaks[j]?.level ?? null),
    };
  });
  before.peaks.forEach((peak, j) => {
    if (taken.has(j)) return;
    const { frequencyHz, order, names } = peak;
    lines.push({ frequencyHz, order, names, level: null, levelBefore: peak.level });
  });
  return lines.sort((a, b) => strength(b) - strength(a)).slice(0, most);
}

function distanceInTolerances(a: SpectralPeak, b: SpectralPeak, toleranceHz: number): number {
  const inHz = Math.abs(a.frequencyHz - b.frequencyHz) / toleranceHz;
  if (a.order === null || b.order === null) return inHz;
  return Math.min(inHz, Math.abs(a.order - b.order) / (0.01 * Math.max(a.order, b.order)));
}

function strength(line: LineFacts): number {
  return Math.max(line.level ?? 0, line.levelBefore ?? 0);
}

/** What became of a line. */
export function lineCourse(line: LineFacts): 'rose' | 'fell' | 'same' | 'new' | 'gone' {
  if (line.levelBefore === null) return 'new';
  if (line.level === null) return 'gone';
  const ratio = line.level / line.levelBefore;
  if (ratio > roseRatio) return 'rose';
  return ratio < 1 / roseRatio ? 'fell' : 'same';
}
