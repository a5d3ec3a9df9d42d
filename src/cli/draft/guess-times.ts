import { offsetMs } from '../../config/local-time.ts';
import { median, medianAbsoluteDeviation } from '../../signal/statistics.ts';

/** What times in names and of change say of a logger: how often it records, what its clock shows. */

const minuteMs = 60_000;
const hourMs = 60 * minuteMs;
const dayMs = 24 * hourMs;
/** A logger has written its recording soon after it ended. */
const mostWrittenAfterMs = 13 * minuteMs;

/** Median of the times between starts, rounded as people set loggers; null for fewer than two starts. */
export function intervalMs(startsMs: readonly number[]): number | null {
  const starts = [...new Set(startsMs)].sort((a, b) => a - b);
  const gaps = starts.slice(1).map((ms, n) => ms - (starts[n] as number));
  if (gaps.length === 0) return null;
  const usual = median(gaps);
  const step = [dayMs, hourMs, 15 * minuteMs, minuteMs, 5000, 1000].find(
    (one) =>
      usual >= one &&
      Math.abs(usual / one - Math.round(usual / one)) * one <= Math.min(0.02 * usual, one / 2),
  );
  const rounded = Math.round(usual / (step ?? 1000)) * (step ?? 1000);
  return Math.min(90 * dayMs, Math.max(1000, rounded));
}

/**
 * What the clock behind the readings shows, as the site file says it: files are written soon after their recording, so
 * the usual distance to the time of change is the clock's offset. Null where the times of change do not tell.
 */
export function clockOf(
  readings: readonly number[],
  changedMs: readonly number[],
  durationS: number | null,
  siteZone: string,
): string | null {
  const distances = readings.map((reading, index) => (changedMs[index] as number) - reading);
  if (distances.length < 3) return null;
  const usual = median(distances);
  if (medianAbsoluteDeviation(distances) > 5 * minuteMs) return null;
  const written = usual - 1000 * (durationS ?? 0);
  const offset = Math.floor((written + minuteMs) / (15 * minuteMs)) * 15 * minuteMs;
  if (written - offset > mostWrittenAfterMs || Math.abs(offset) > 14 * hourMs) return null;
  const aheadMs = -offset;
  const zoneMs = offsetMs(readings.at(-1) as number, siteZone);
  if (aheadMs === 0) return 'UTC';
  if (aheadMs === zoneMs) return 'site';
  const two = (value: number) => String(Math.floor(value)).padStart(2, '0');
  const size = Math.abs(aheadMs);
  return `${aheadMs < 0 ? '-' : '+'}${two(size / hourMs)}:${two((size % hourMs) / minuteMs)}`;
}
