/**
 * Segments behind an averaged density: those of one recording, or of each of several recordings whose segments are
 * pooled in one average. Segments of one recording that overlap repeat each other; those of different recordings are
 * independent, so only pairs within a recording count.
 */
export type Segments = number | readonly number[];

export function totalSegments(segments: Segments): number {
  return typeof segments === 'number' ? segments : segments.reduce((sum, count) => sum + count, 0);
}

/** Segments of the longest recording: none are further apart than that. */
export function mostSegments(segments: Segments): number {
  return typeof segments === 'number' ? segments : Math.max(0, ...segments);
}

/**
 * Pairs of segments that lie m hops apart, over all segments: 1 - m / K for one recording of K,
 * sum (K_i - m) / sum K_i over the recordings longer than m where several are pooled.
 */
export function pairShare(segments: Segments, m: number): number {
  if (typeof segments === 'number') return 1 - m / segments;
  const pairs = segments.reduce((sum, count) => sum + Math.max(0, count - m), 0);
  return pairs / totalSegments(segments);
}

/** How many recordings have each count of segments, smallest first. */
export function countsOfSegments(
  segments: Segments,
): readonly (readonly [segments: number, recordings: number])[] {
  if (typeof segments === 'number') return [[segments, 1]];
  const counts = new Map<number, number>();
  for (const count of segments) counts.set(count, (counts.get(count) ?? 0) + 1);
  return [...counts].sort(([a], [b]) => a - b);
}

/** The same for any order of the recordings, e.g. `2x29 3x1`: what a result that is remembered depends on. */
export function segmentsKey(segments: Segments): string {
  return countsOfSegments(segments)
    .map(([count, recordings]) => `${count}x${recordings}`)
    .join(' ');
}
