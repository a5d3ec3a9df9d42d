import { usableLines } from './floor.ts';
import { floorSpreadLimit, levelVariance } from './floor-spread.ts';
import { leakageOf } from './leakage.ts';
import { levelLimit, lineLimit, type PeakSpread, peakSpread } from './peak-spread.ts';
import type { PeakSearch, PeakSettings } from './peaks.ts';
import type { SegmentSpectra } from './segment-spectra.ts';

/** Whether a recording was steady enough for one spectrum to describe it. */
export interface Steadiness {
  /** Deviation of the floor between segments over the most that steady noise shows; null if too few lines are free of peaks. */
  readonly floorSpreadRatio: number | null;
  /** Spread of the strongest peak's level over 10 % or of its frequency over half a line; null if no peak stands out enough. */
  readonly peakSpreadRatio: number | null;
  /** The larger of both: above 1 is unsteady. */
  readonly segmentSpread: number;
  readonly unsteady: boolean;
  /** In words, what varied; empty if steady. */
  readonly detail: string;
}

/** Fewer lines than these say nothing about the floor. */
const leastFloorLines = 32;

/**
 * Judges the spread from segment to segment of a recording: of the noise floor with the peaks taken out, against its
 * 99.9 % point in steady noise (`floor-spread.ts`), and of the strongest peak's level and frequency (`peak-spread.ts`).
 * Two figures, because on a machine full of tones the floor says nothing of the tones, nor a sum over all lines of
 * either. Null below four groups of segments.
 *
 * `segments`: the densities of the segments behind `search`; `settings` as for the search. False flags, measured on
 * steady noise: 0.05 to 0.2 % of white and pink, up to 0.3 % of noise that falls as 1/f², for all windows but the
 * rectangular, which spreads the jump between a segment's ends over all lines: on 1/f² noise it is flagged in vain.
 */
export function steadiness(
  segments: SegmentSpectra,
  search: PeakSearch,
  settings: PeakSettings,
): Steadiness | null {
  if (segments.count < 4) return null;
  const floorSpreadRatio = floorSpread(segments, search, settings);
  const peak = peakSpread(segments, search, settings);
  if (floorSpreadRatio === null && peak === null) return null;
  const segmentSpread = Math.max(floorSpreadRatio ?? 0, peak?.ratio ?? 0);
  const reasons: string[] = [];
  if (floorSpreadRatio !== null && floorSpreadRatio > 1) {
    reasons.push(
      `the noise floor varies ${figures(floorSpreadRatio, 2)} times as much as steady noise would`,
    );
  }
  if (peak !== null) reasons.push(...peakReasons(peak));
  return {
    floorSpreadRatio,
    peakSpreadRatio: peak?.ratio ?? null,
    segmentSpread,
    unsteady: segmentSpread > 1,
    detail: reasons.join('; '),
  };
}

/** Of level and frequency what went beyond its limit, with the limit. */
function peakReasons({ frequencyHz, levelSpread, lineSpread }: PeakSpread): string[] {
  const peak = `of the peak at ${figures(frequencyHz, 4)} Hz moves by`;
  const reasons: string[] = [];
  if (levelSpread > levelLimit)
    reasons.push(`the level ${peak} ±${figures(100 * levelSpread, 2)} %, more than ±${100 * levelLimit} %`);
  if (lineSpread > lineLimit)
    reasons.push(`the frequency ${peak} ±${figures(lineSpread, 2)} lines, more than ±${lineLimit} lines`);
  return reasons;
}

/** So many significant figures, never with an exponent. */
function figures(value: number, count: number): string {
  return String(Number(value.toPrecision(count)));
}

/**
 * Half range of an even drift of the floor's power that is let pass beside what chance makes: with thousands of lines the
 * 99.9 % point alone would flag a drift of a few percent, which pumps, fans and reciprocating machines always have.
 */
const leastSpread = 0.2;

function floorSpread(segments: SegmentSpectra, search: PeakSearch, settings: PeakSettings): number | null {
  const marked = floorLines(search, settings);
  const lines = marked.reduce((sum, mark) => sum + mark, 0);
  if (lines < leastFloorLines) return null;
  const weights = search.floor.map((floor, line) => (marked[line] === 1 ? 1 / floor : 0));
  const groups = segments.count;
  const levels = new Float64Array(groups);
  let mean = 0;
  for (let g = 0; g < groups; g++) {
    const density = segments.group(g);
    let sum = 0;
    for (let line = 0; line < weights.length; line++) sum += weights[line] * density[line];
    levels[g] = sum / lines;
    mean += levels[g] / groups;
  }
  // Silent on every line outside the peaks: there is no floor to vary.
  if (mean === 0) return null;
  let squares = 0;
  for (const level of levels) squares += (level / mean - 1) ** 2;
  const variance = squares / (groups - 1);
  const limit =
    floorSpreadLimit({ ...settings, segmentsPerGroup: segments.segmentsPerGroup, groups }) *
    levelVariance(settings.window, settings.segmentSamples, marked);
  return Math.sqrt(variance / (limit + leastSpread ** 2 / 3));
}

/** Marks the lines where noise alone counts: outside peaks, and where these leak less than a twentieth of the floor. */
function floorLines(search: PeakSearch, settings: PeakSettings): Uint8Array {
  const { floor, peaks } = search;
  const { firstLine, lastLine } = usableLines(settings);
  const marked = new Uint8Array(floor.length);
  if (lastLine < firstLine) return marked;
  // Nearest the ends the floor is known less well, and a line of a floor too low would count for many.
  const margin = Math.min(16, Math.floor((lastLine - firstLine + 1) / 20));
  marked.fill(1, firstLine + margin, lastLine + 1 - margin);
  for (let line = firstLine; line <= lastLine; line++) if (!(floor[line] > 0)) marked[line] = 0;
  const leakage = leakageOf(settings.window, settings.segmentSamples);
  const lineSpacingHz = settings.sampleRateHz / settings.segmentSamples;
  for (const peak of peaks) {
    marked.fill(0, peak.firstLine, peak.lastLine + 1);
    const source = {
      firstLine: peak.firstLine,
      lastLine: peak.lastLine,
      amplitude: Math.sqrt(peak.power / lineSpacingHz),
    };
    for (const direction of [-1, 1]) {
      let line = direction < 0 ? peak.firstLine - 1 : peak.lastLine + 1;
      while (
        line >= firstLine &&
        line <= lastLine &&
        leakage.amplitudeAt(line, source) ** 2 > 0.05 * floor[line]
      ) {
        marked[line] = 0;
        line += direction;
      }
    }
  }
  return marked;
}
