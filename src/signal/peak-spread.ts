import { Kept } from './kept.ts';
import { windowCorrelations } from './overlap.ts';
import type { Peak, PeakSearch, PeakSettings } from './peaks.ts';
import type { SegmentSpectra } from './segment-spectra.ts';
import { chiSquareQuantile, median } from './statistics.ts';
import { ToneFitter } from './tone-fit.ts';
import { mainLobeHalfWidthLines, noiseBandwidthLines } from './window.ts';

export interface PeakSpread {
  /** The larger of both spreads over its limit. */
  readonly ratio: number;
  /** Half the range of an even drift with the deviation found, as a share of the mean level. */
  readonly levelSpread: number;
  /** The same of the frequency, in lines. */
  readonly lineSpread: number;
  readonly frequencyHz: number;
}

/** Beyond these the peak is not steady. */
export const levelLimit = 0.1;
export const lineLimit = 0.5;
/** Height over the floor from which a peak can be measured in a single group: 13 dB. */
const leastHeight = 20;
/** Share of a peak's power that lies in one main lobe if it is a tone, at rest or moving. Noise in a hump spreads wider. */
const toneShare = 0.7;
/** Peaks tried, strongest first, until one is a tone. */
const mostTried = 5;

/**
 * Spread of the strongest tone from group to group. Null if none of the five strongest peaks stands 13 dB over the
 * floor in the single groups with most of its power in one main lobe (a hump of noise has no level or frequency of
 * its own).
 *
 * What the noise around a tone does to its reading is taken off at its 99.9 % point, variance by variance: on a line of
 * signal-to-noise ratio S, averaged g times, relative deviation of the level sqrt(0.75 / (S g)), of the frequency
 * 0.45 B / sqrt(S g) lines with B the window's noise bandwidth, rectangular 2.1 / sqrt(S g) (simulated at S = 25 and
 * 30 dB over all places between two lines; rounded up).
 */
export function peakSpread(
  segments: SegmentSpectra,
  search: PeakSearch,
  settings: PeakSettings,
): PeakSpread | null {
  const fitter = new ToneFitter(settings.window, settings.segmentSamples);
  const averages = independentAverages(settings, segments.segmentsPerGroup);
  for (const peak of search.peaks.slice(0, mostTried)) {
    const readings = readGroups(segments, peak, settings, fitter);
    if (readings === null) continue;
    const floorOverTone = peak.floorDensity / (readings.meanDensity * averages);
    const noise = chiSquareQuantile(0.999, segments.count - 1) / (segments.count - 1);
    const levelNoise = 0.75 * floorOverTone * noise;
    const perLine = settings.window === 'rectangular' ? 2.1 : 0.45 * noiseBandwidthLines(settings.window);
    const lineNoise = perLine ** 2 * floorOverTone * noise;
    const levelSpread = Math.sqrt(3 * Math.max(0, readings.levelVariance - levelNoise));
    const lineSpread = Math.sqrt(3 * Math.max(0, readings.lineVariance - lineNoise));
    return {
      ratio: Math.max(levelSpread / levelLimit, lineSpread / lineLimit),
      levelSpread,
      lineSpread,
      frequencyHz: peak.frequencyHz,
    };
  }
  return null;
}

interface GroupReadings {
  readonly meanDensity: number;
  /** Of the level over its mean. */
  readonly levelVariance: number;
  /** Of the frequency, lines². */
  readonly lineVariance: number;
}

function readGroups(
  segments: SegmentSpectra,
  peak: Peak,
  settings: PeakSettings,
  fitter: ToneFitter,
): GroupReadings | null {
  const halfWidth = mainLobeHalfWidthLines(settings.window);
  const last = settings.segmentSamples / 2 - halfWidth;
  const from = Math.max(halfWidth, peak.firstLine - 1);
  const to = Math.min(last, peak.lastLine + 1);
  const floor = peak.floorDensity;
  const levels: number[] = [];
  const lines: number[] = [];
  const heights: number[] = [];
  const shares: number[] = [];
  // Only the lines that are looked at are copied.
  const first = Math.max(0, from - halfWidth - 4);
  const past = Math.min(segments.lineCount, to + halfWidth + 5);
  const density = new Float64Array(segments.lineCount);
  for (let g = 0; g < segments.count; g++) {
    density.set(segments.group(g).subarray(first, past), first);
    let highest = from;
    for (let line = from; line <= to; line++) if (density[line] > density[highest]) highest = line;
    const fit = fitter.fit(density, highest, floor);
    levels.push(Math.sqrt(fit.density));
    lines.push(fit.line);
    heights.push(density[highest]);
    const inLobe = powerAbove(density, floor, highest - halfWidth, highest + halfWidth);
    shares.push(inLobe / powerAbove(density, floor, from - halfWidth, to + halfWidth));
  }
  if (median(heights) < leastHeight * floor || median(shares) < toneShare) return null;
  const level = mean(levels);
  return {
    meanDensity: level ** 2,
    levelVariance: variance(levels) / level ** 2,
    lineVariance: variance(lines),
  };
}

function powerAbove(density: Float64Array, floor: number, from: number, to: number): number {
  let sum = 0;
  for (let k = Math.max(0, from); k <= Math.min(density.length - 1, to); k++)
    sum += Math.max(0, density[k] - floor);
  return sum;
}

function mean(values: readonly number[]): number {
  return values.reduce((sum, value) => sum + value, 0) / values.length;
}

function variance(values: readonly number[]): number {
  const middle = mean(values);
  return values.reduce((sum, value) => sum + (value - middle) ** 2, 0) / (values.length - 1);
}

const keptAverages = new Kept<string, number>(64);

/** Averages that a group is worth for the noise beside a tone, which adds by amplitude: g / (1 + 2 sum (1 - m/g) rho_m). */
function independentAverages(settings: PeakSettings, segments: number): number {
  const { window, segmentSamples, hopSamples } = settings;
  return keptAverages.get(`${window} ${segmentSamples} ${hopSamples} ${segments}`, () => {
    const correlations = windowCorrelations(window, segmentSamples, hopSamples);
    let sum = 0;
    for (let m = 1; m < Math.min(segments, correlations.length); m++)
      sum += (1 - m / segments) * correlations[m];
    return segments / Math.max(1, 1 + 2 * sum);
  });
}
