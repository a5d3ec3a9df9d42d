import { type NoiseFloor, usableLines } from './floor.ts';
import { humpRegion } from './hump.ts';
import { type Leakage, type LeakageSource, leakageOf } from './leakage.ts';
import type { MedianDensity } from './median-average.ts';
import { totalSegments } from './pooled-segments.ts';
import { type Searched, searchedMean, searchedMedian } from './searched-density.ts';
import type { AveragingShape } from './threshold.ts';
import { ToneFitter } from './tone-fit.ts';
import { mainLobeHalfWidthLines, noiseBandwidthLines } from './window.ts';

export interface PeakSettings extends AveragingShape {
  readonly sampleRateHz: number;
  /** False peaks that noise alone may give in a spectrum, on average. Default 0.1. */
  readonly falsePeaksPerSpectrum?: number;
  /** Where the search looks for peaks, over this one's own floor; their levels are the density's all the same. */
  readonly searchIn?: MedianDensity;
}

/** A spectral maximum that stands out of the local noise floor. */
export interface Peak {
  /** `tone`: a sinusoid, as wide as the window's main lobe. `hump`: wider, such as a tone whose speed wanders. */
  readonly kind: 'tone' | 'hump';
  readonly frequencyHz: number;
  /** The frequency in lines, with its fraction. */
  readonly line: number;
  /** r.m.s. of the sinusoid, in the unit of the samples; of a hump, of all it holds above the floor. */
  readonly level: number;
  /** The level squared. */
  readonly power: number;
  /** The highest line over the floor, dB. */
  readonly aboveFloorDb: number;
  /** Lines it occupies. */
  readonly firstLine: number;
  readonly lastLine: number;
  /** The floor below it, (unit)²/Hz. */
  readonly floorDensity: number;
}

export interface PeakSearch {
  /** Noise floor on every line, (unit)²/Hz; 0 in the main lobes of 0 and Nyquist. */
  readonly floor: Float64Array;
  /** Strongest first, at most 200. */
  readonly peaks: readonly Peak[];
}

/** More peaks than that would help nobody. */
const mostPeaks = 200;
/** Maxima looked at, strongest first: bounds the work on a hostile spectrum. */
const mostCandidates = 2000;
/** Densities below this part of the largest are rounding of the transform, not signal. */
const roundingOfLargest = 1e-25;

/**
 * Peaks of a power-averaged one-sided density, lines 0 .. N/2 in (unit)²/Hz.
 *
 * A line is a peak if it is higher than its neighbours, lies outside the main lobes of 0 and Nyquist, passes the
 * exact tail of the averaged noise (`threshold.ts`) over the floor (`floor.ts`), and passes the leakage of all
 * stronger peaks: at least 3 dB over the window's side lobes there, and over side lobes and noise threshold together
 * when both add up in phase. Frequency and level come from the window's own main lobe (`tone-fit.ts`).
 *
 * A density that is not finite (no segment fitted) has no peaks. Throws a RangeError if the density's length does not
 * fit the segment. Checked: a sine of amplitude sqrt 2 halfway between lines 100 and 101 has level 1 and line 100.5.
 *
 * Measured limits of the rectangular window, whose side lobes fall so slowly that a tone's mirror image reaches
 * everywhere: a pure tone reads true to 0.04 line and 0.5 % from 30 lines off the ends, to 0.2 line and 3 % nearer; of
 * two tones six lines apart the second one's frequency is good to a line only; equal ones are told apart in 98 of 100,
 * one 20 dB down is found in 84 to 98 of 100 (1 to 31 averages). All other windows: 0.002 line, 0.03 % from 3 (Hann, Hamming), 4, 5 and 6 lines on.
 */
export function findPeaks(density: Float64Array, settings: PeakSettings): PeakSearch {
  const { segmentSamples, falsePeaksPerSpectrum = 0.1 } = settings;
  if (density.length !== segmentSamples / 2 + 1) {
    throw new RangeError(
      `density of ${density.length} lines: a segment of ${segmentSamples} samples has ${segmentSamples / 2 + 1}`,
    );
  }
  const { firstLine, lastLine } = usableLines(settings);
  const empty = { floor: new Float64Array(density.length), peaks: [] };
  if (totalSegments(settings.averages) < 1 || lastLine < firstLine || !Number.isFinite(density[firstLine]))
    return empty;
  const perLine = falsePeaksPerSpectrum / (lastLine - firstLine + 1);
  const measured = searchedMean(density, settings, perLine);
  const searched =
    settings.searchIn === undefined ? measured : searchedMedian(settings.searchIn, settings, perLine);
  const peaks = new PeakPicker(searched, measured, settings, perLine).pick();
  return { floor: searched.noise.floor, peaks };
}

/** One search: goes through the maxima from the strongest down and keeps what the stronger ones do not explain. */
class PeakPicker {
  private readonly density: Float64Array;
  private readonly noise: NoiseFloor;
  private readonly toneGain: number;
  /** What levels are taken from: `density` itself, unless the search is made in another average. */
  private readonly measured: Searched;
  private readonly halfWidth: number;
  private readonly leakage: Leakage;
  private readonly fitter: ToneFitter;
  private readonly threshold: (lines: number) => number;
  private readonly lineSpacingHz: number;
  private readonly bandwidthHz: number;
  private readonly sources: LeakageSource[] = [];

  constructor(searched: Searched, measured: Searched, settings: PeakSettings, perLine: number) {
    this.density = searched.density;
    this.noise = searched.noise;
    this.toneGain = searched.toneGain;
    this.measured = measured;
    this.halfWidth = mainLobeHalfWidthLines(settings.window);
    this.leakage = leakageOf(settings.window, settings.segmentSamples);
    this.fitter = new ToneFitter(settings.window, settings.segmentSamples);
    this.threshold = searched.statistics.thresholds(perLine);
    this.lineSpacingHz = settings.sampleRateHz / settings.segmentSamples;
    this.bandwidthHz = noiseBandwidthLines(settings.window) * this.lineSpacingHz;
  }

  pick(): Peak[] {
    const { firstLine, lastLine } = this.noise;
    const peaks: Peak[] = [];
    for (const line of this.maxima()) {
      if (this.explained(line)) continue;
      if (line < firstLine || line > lastLine || !this.isMeasurable(line)) {
        // Too near an end to be measured, but its side lobes reach further in.
        this.sources.push({ firstLine: line, lastLine: line, amplitude: Math.sqrt(this.density[line]) });
        continue;
      }
      const peak = this.measure(line);
      peaks.push(peak);
      if (peaks.length === mostPeaks) break;
    }
    return peaks.sort((a, b) => b.level - a.level);
  }

  /** A peak that the median shows has a level only if the mean shows it at all: 3 dB over its floor. */
  private isMeasurable(line: number): boolean {
    const { density, noise } = this.measured;
    return density === this.density || density[line] >= 2 * noise.floor[line];
  }

  /** Lines higher than both neighbours and above the noise threshold, strongest first. */
  private maxima(): number[] {
    const { density } = this;
    const { floor, linesBehind, firstLine, lastLine } = this.noise;
    let largest = 0;
    for (const value of density) if (value > largest) largest = value;
    const least = roundingOfLargest * largest;
    const found: number[] = [];
    for (let line = 0; line < density.length; line++) {
      const value = density[line];
      if (value <= least) continue;
      if (line > 0 && value < density[line - 1]) continue;
      if (line < density.length - 1 && value <= density[line + 1]) continue;
      const near = Math.min(lastLine, Math.max(firstLine, line));
      if (value > this.threshold(linesBehind[near]) * floor[near]) found.push(line);
    }
    return found.sort((a, b) => density[b] - density[a]).slice(0, mostCandidates);
  }

  /**
   * Whether stronger peaks account for the line: it lies within one, or below their leakage. Between two lines a weak
   * tone and a side lobe may add on one and cancel on the other; the power of both tells them apart.
   */
  private explained(line: number): boolean {
    const { density, halfWidth } = this;
    for (const source of this.sources) {
      if (line > source.firstLine - halfWidth && line < source.lastLine + halfWidth) return true;
    }
    const limit = this.leakageLimit(line);
    if (density[line] >= limit) return false;
    const partner = line > 0 && density[line - 1] > (density[line + 1] ?? 0) ? line - 1 : line + 1;
    return !(density[line] + density[partner] >= limit + this.leakageLimit(partner));
  }

  /** What stronger peaks and noise may read on a line. */
  private leakageLimit(line: number): number {
    const { floor, linesBehind, firstLine, lastLine } = this.noise;
    const leaked = this.leakedAt(line);
    const near = Math.min(lastLine, Math.max(firstLine, line));
    const noise = Math.sqrt(this.threshold(linesBehind[near]) * floor[near]);
    return Math.max(2 * leaked ** 2, (leaked + noise) ** 2);
  }

  /** Upper bound of what the peaks found so far leak into a line, as an amplitude. */
  private leakedAt(line: number): number {
    let leaked = 0;
    for (const source of this.sources) leaked += this.leakage.amplitudeAt(line, source);
    return leaked;
  }

  /**
   * The floor under a peak as far as it is noise. Under the rectangular window the median around a tone may be the
   * tone's own leakage, 1 / (pi d)² of it at d lines, and must not be taken off it.
   */
  private noiseUnder(line: number): number {
    const { density, noise } = this.measured;
    const floor = noise.floor[line];
    if (this.halfWidth > 1) return floor;
    const typicalDistance = noise.linesBehind[line] / 4;
    return floor > (2 * density[line]) / (Math.PI * typicalDistance) ** 2 ? floor : 0;
  }

  private measure(line: number): Peak {
    const { lineSpacingHz, toneGain } = this;
    const { density, noise } = this.measured;
    const floorDensity = noise.floor[line];
    const isClean = (at: number): boolean => 16 * this.leakedAt(at) ** 2 < density[at];
    const fit = this.fitter.fit(density, line, this.noiseUnder(line), isClean);
    const hump = humpRegion(density, noise, this.halfWidth, line, (at) => this.leakageLimit(at));
    const leastFloor = roundingOfLargest * density[line];
    const aboveFloorDb = 10 * Math.log10(density[line] / Math.max(this.noise.floor[line], leastFloor));
    if (hump === null) {
      const power = fit.density * this.bandwidthHz;
      this.sources.push({
        firstLine: fit.line,
        lastLine: fit.line,
        amplitude: toneGain * Math.sqrt(fit.density),
      });
      return {
        kind: 'tone',
        frequencyHz: fit.line * lineSpacingHz,
        line: fit.line,
        level: Math.sqrt(power),
        power,
        aboveFloorDb,
        firstLine: Math.max(0, Math.ceil(fit.line - this.halfWidth)),
        lastLine: Math.min(density.length - 1, Math.floor(fit.line + this.halfWidth)),
        floorDensity,
      };
    }
    const power = hump.excess * lineSpacingHz;
    this.sources.push({
      firstLine: hump.firstLine,
      lastLine: hump.lastLine,
      amplitude: toneGain * Math.sqrt(power / this.bandwidthHz),
    });
    return {
      kind: 'hump',
      frequencyHz: hump.centre * lineSpacingHz,
      line: hump.centre,
      level: Math.sqrt(power),
      power,
      aboveFloorDb,
      firstLine: hump.firstLine,
      lastLine: hump.lastLine,
      floorDensity,
    };
  }
}
