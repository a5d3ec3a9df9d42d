import { type Leakage, leakageOf } from './leakage.ts';
import { binsOf, runningMedian } from './running-median.ts';
import { type AveragingShape, type NoiseStatistics, noiseStatistics } from './threshold.ts';
import { mainLobeHalfWidthLines } from './window.ts';

/** Lines on either side that the running median spans: 301 in all. */
const reach = 150;
/** Lines on either side of the short running median, which follows broad humps of the noise. */
const shortReach = 40;

export interface NoiseFloor {
  /** Mean of the noise per line, in the unit of the density. 0 outside `firstLine` .. `lastLine`. */
  readonly floor: Float64Array;
  /** Lines whose median stands behind each value, rounded down to one of seven steps. */
  readonly linesBehind: Uint16Array;
  /** Lines outside the main lobes of 0 and Nyquist; the others take no part. */
  readonly firstLine: number;
  readonly lastLine: number;
}

/** First and last line outside the main lobes of 0 and of Nyquist. The last is smaller where no line is left. */
export function usableLines(shape: AveragingShape): { firstLine: number; lastLine: number } {
  const halfWidth = mainLobeHalfWidthLines(shape.window);
  return { firstLine: halfWidth + 1, lastLine: shape.segmentSamples / 2 - halfWidth - 1 };
}

/**
 * Noise floor of an averaged density, lines 0 .. N/2, (unit)²/Hz, finite and not negative.
 *
 * The median over 301 lines around each, divided by the exact ratio of median to mean of an averaged noise line, so
 * that tones leave it alone and noise of any number of averages is met without bias. Coloured noise is followed by
 * three means: the median is symmetric, so a slope does not bias it; near the ends the window narrows to stay
 * symmetric, and the last lines continue the slope found further in where it rises towards the end; and where the
 * median over 81 lines is clearly higher (2.5 standard deviations), it takes over: noise that is broader than about
 * 40 lines is floor, narrower is a peak. Lines that pass the threshold, and the skirts of strong ones, are left out of
 * a second pass, so that even a dense family of harmonics lifts it little.
 *
 * `perLine`: probability with which a line of noise may pass the threshold. Spectra of fewer than 301 usable lines use
 * what there is. `statistics`: of the density's lines, where it is no mean of the segments.
 */
export function noiseFloor(
  density: Float64Array,
  shape: AveragingShape,
  perLine: number,
  statistics: NoiseStatistics = noiseStatistics(shape),
): NoiseFloor {
  const { firstLine, lastLine } = usableLines(shape);
  const floor = new Float64Array(density.length);
  const linesBehind = new Uint16Array(density.length);
  const result = { floor, linesBehind, firstLine, lastLine };
  if (lastLine < firstLine) return result;
  const lines = new Int32Array(lastLine - firstLine + 1);
  for (let i = 0; i < lines.length; i++) lines[i] = firstLine + i;
  const leastReach = narrowestReach(mainLobeHalfWidthLines(shape.window), statistics);
  const leakage = leakageOf(shape.window, shape.segmentSamples);
  floor.fill(1, firstLine, lastLine + 1);
  floorFromLines(density, lines, leastReach, statistics, result);
  const left = linesWithoutPeaks(density, result, statistics.thresholds(perLine), leakage);
  const enough = left.length > Math.max(2 * leastReach, 0.1 * lines.length);
  floorFromLines(density, enough ? left : lines, leastReach, statistics, result);
  doubtOnSlopes(result);
  return result;
}

/**
 * Reach of the median nearest the ends: as little as gives its deviation 12 %, but wide enough that a tone covers less
 * than half of it; with few averages that would be wide, and bounded the other way.
 */
function narrowestReach(halfWidth: number, statistics: NoiseStatistics): number {
  const least = 2 * halfWidth + 2;
  const most = 5 * Math.max(3, halfWidth + 1);
  const wanted = (statistics.medianDeviation(1) / 0.12) ** 2 / 2;
  return Math.round(Math.min(most, Math.max(least, wanted)));
}

/**
 * Refines the floor from the lines listed (ascending), and between them geometrically. The medians are those of the
 * density over the floor found so far, so that on the second time a cliff, such as an anti-aliasing filter's, is level.
 */
function floorFromLines(
  density: Float64Array,
  lines: Int32Array,
  leastReach: number,
  statistics: NoiseStatistics,
  { floor, linesBehind, firstLine, lastLine }: NoiseFloor,
): void {
  const count = lines.length;
  const values = new Float64Array(count);
  for (let i = 0; i < count; i++) values[i] = floor[lines[i]] > 0 ? density[lines[i]] / floor[lines[i]] : 0;
  const bins = binsOf(values);
  const medians = runningMedian(bins, reach, leastReach);
  const short =
    count > 2 * shortReach ? runningMedian(bins, Math.max(shortReach, leastReach), leastReach) : medians;
  const least = Math.min(leastReach, Math.floor((count - 1) / 2));
  const shortDeviation = statistics.medianDeviation(2 * shortReach + 1);
  let previous = -1;
  continueSlopes(medians, lines, least);
  for (let i = 0; i < count; i++) {
    const side = Math.max(least, Math.min(reach, i, count - 1 - i));
    const excess = short[i] / medians[i] - 1;
    const trust = Math.min(1, excess / shortDeviation - 2.5);
    const line = lines[i];
    floor[line] *= (medians[i] * (trust > 0 ? 1 + trust * excess : 1)) / statistics.medianOverMean;
    const behind = trust > 0 ? Math.min(side, shortReach) : side;
    linesBehind[line] = step(i < least || i >= count - least ? behind : 2 * behind + 1);
    if (line > previous + 1) bridge(floor, linesBehind, previous, line, firstLine);
    previous = line;
  }
  if (previous < lastLine) {
    floor.fill(floor[previous], previous + 1, lastLine + 1);
    linesBehind.fill(linesBehind[previous], previous + 1, lastLine + 1);
  }
}

/**
 * Where the floor changes by half or more within the reach of the short median, its wide median stands for less: the
 * bend of a filter's knee or of a resonance is followed only as well as by 31 lines.
 */
function doubtOnSlopes({ floor, linesBehind, firstLine, lastLine }: NoiseFloor): void {
  for (let line = firstLine; line <= lastLine; line++) {
    const before = floor[Math.max(firstLine, line - shortReach)];
    const after = floor[Math.min(lastLine, line + shortReach)];
    if (after > 2 * before || before > 2 * after) linesBehind[line] = Math.min(linesBehind[line], 31);
  }
}

/** So that thresholds are computed for a few counts only. */
function step(lines: number): number {
  for (const rung of [301, 201, 121, 81, 51, 31, 21]) if (lines >= rung) return rung;
  return Math.max(1, Math.min(15, lines));
}

/** The floor of lines left out lies on the geometric straight line between their neighbours. */
function bridge(
  floor: Float64Array,
  linesBehind: Uint16Array,
  from: number,
  to: number,
  firstLine: number,
): void {
  if (from < firstLine) {
    floor.fill(floor[to], firstLine, to);
    linesBehind.fill(linesBehind[to], firstLine, to);
    return;
  }
  const ratio = floor[from] > 0 ? (floor[to] / floor[from]) ** (1 / (to - from)) : 1;
  for (let line = from + 1; line < to; line++) {
    floor[line] = floor[line - 1] * ratio;
    linesBehind[line] = Math.min(linesBehind[from], linesBehind[to]);
  }
}

/**
 * Nearest the ends no symmetric window is wide enough. Where the medians further in rise towards the end, the rise
 * is continued, as a power of frequency at the low end, exponentially at the high one; the steeper of a near and a far
 * estimate counts, because a floor that is too low makes false peaks while one that is too high hides little.
 */
function continueSlopes(medians: Float64Array, lines: Int32Array, least: number): void {
  const count = medians.length;
  const near = 2 * least;
  if (near >= count / 2) return;
  const far = Math.min(reach, Math.floor(count / 2));
  const low = Math.log(medians[least]);
  const lowSlope = Math.max(
    0,
    ...[near, far].map((i) => (low - Math.log(medians[i])) / Math.log(lines[i] / lines[least])),
  );
  const end = count - 1 - least;
  const high = Math.log(medians[end]);
  const highSlope = Math.max(
    0,
    ...[near, far].map(
      (i) => (high - Math.log(medians[count - 1 - i])) / (lines[end] - lines[count - 1 - i]),
    ),
  );
  if (lowSlope > 0 && lowSlope < Number.POSITIVE_INFINITY) {
    for (let i = 0; i < least; i++) medians[i] *= (lines[least] / lines[i]) ** lowSlope;
  }
  if (highSlope > 0 && highSlope < Number.POSITIVE_INFINITY) {
    for (let i = end + 1; i < count; i++) medians[i] *= Math.exp(highSlope * (lines[i] - lines[end]));
  }
}

/** The lines below the threshold and off the skirts of those above. Runs too long to be peaks stay in. */
function linesWithoutPeaks(
  density: Float64Array,
  { floor, linesBehind, firstLine, lastLine }: NoiseFloor,
  threshold: (lines: number) => number,
  leakage: Leakage,
): Int32Array {
  const out = new Uint8Array(density.length);
  const above = (line: number): boolean => density[line] > threshold(linesBehind[line]) * floor[line];
  let found = false;
  for (let line = firstLine; line <= lastLine; line++) {
    if (!above(line)) continue;
    const from = line;
    let highest = density[line];
    while (line < lastLine && above(line + 1)) highest = Math.max(highest, density[++line]);
    if (line - from > 2 * shortReach) continue;
    let skirt = 1;
    while (skirt < shortReach && highest * leakage.bound(skirt) ** 2 > 0.25 * floor[line]) skirt++;
    out.fill(1, Math.max(firstLine, from - skirt), Math.min(lastLine, line + skirt) + 1);
    found = true;
  }
  const left = new Int32Array(lastLine - firstLine + 1);
  let count = 0;
  for (let line = firstLine; line <= lastLine; line++) if (out[line] === 0) left[count++] = line;
  return found ? left.subarray(0, count) : left;
}
