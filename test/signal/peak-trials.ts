import { averageDensity, hopSamples } from '../../src/signal/averaging.ts';
import { findPeaks, type Peak, type PeakSearch } from '../../src/signal/peaks.ts';
import { noiseBandwidthLines, type WindowName } from '../../src/signal/window.ts';
import { type Colour, colouredNoise } from './coloured-noise.ts';
import type { SeededRandom } from './random.ts';

export interface Trial {
  readonly window: WindowName;
  readonly segmentSamples: number;
  readonly overlapPercent: number;
  readonly averages: number;
}

/** Samples that give exactly so many averages. */
export function samplesOf({ segmentSamples, overlapPercent, averages }: Trial): number {
  return segmentSamples + (averages - 1) * hopSamples(segmentSamples, overlapPercent);
}

/** Adds a sinusoid of the given r.m.s. `line` is its frequency in lines. */
export function addTone(
  samples: Float64Array,
  trial: Trial,
  line: number,
  level: number,
  phase: number,
): void {
  for (let n = 0; n < samples.length; n++) {
    samples[n] += Math.SQRT2 * level * Math.cos((2 * Math.PI * line * n) / trial.segmentSamples + phase);
  }
}

/** Peaks of samples taken at 1 Hz. */
export function searchPeaks(samples: Float64Array, trial: Trial): PeakSearch {
  const averaged = averageDensity(samples, { ...trial, sampleRateHz: 1 });
  if (averaged.averages !== trial.averages) throw new Error('the samples do not give the averages meant');
  return findPeaks(averaged.density, { ...trial, sampleRateHz: 1, hopSamples: averaged.hopSamples });
}

/** r.m.s. of a tone whose line stands so many dB over white noise of variance 1. */
export function levelOverWhite(trial: Trial, overFloorDb: number): number {
  return Math.sqrt((10 ** (overFloorDb / 10) * 2 * noiseBandwidthLines(trial.window)) / trial.segmentSamples);
}

/** Peaks found in noise alone, all of them false, over so many spectra. */
export function falsePeaksInNoise(
  trial: Trial,
  colour: Colour,
  random: SeededRandom,
  spectra: number,
): number {
  let found = 0;
  for (let t = 0; t < spectra; t++) {
    found += searchPeaks(colouredNoise(colour, random, samplesOf(trial)), trial).peaks.length;
  }
  return found;
}

export interface ToneTrials {
  /** Peaks other than the tone. */
  readonly falsePeaks: number;
  readonly missed: number;
  /** 95 % point of |found - true|: lines, and share of the level. */
  readonly lineError: number;
  readonly levelError: number;
}

/** One tone at a random frequency and phase in white noise, over so many spectra. */
export function toneInNoise(
  trial: Trial,
  overFloorDb: number,
  random: SeededRandom,
  spectra: number,
): ToneTrials {
  const level = levelOverWhite(trial, overFloorDb);
  const half = trial.segmentSamples / 2;
  const lineErrors: number[] = [];
  const levelErrors: number[] = [];
  let falsePeaks = 0;
  for (let t = 0; t < spectra; t++) {
    const samples = colouredNoise('white', random, samplesOf(trial));
    const line = 20 + random.uniform() * (half - 40);
    addTone(samples, trial, line, level, 2 * Math.PI * random.uniform());
    const { peaks } = searchPeaks(samples, trial);
    const found = nearest(peaks, line);
    falsePeaks += peaks.length - (found === undefined ? 0 : 1);
    if (found === undefined) continue;
    lineErrors.push(Math.abs(found.line - line));
    levelErrors.push(Math.abs(found.level / level - 1));
  }
  const point = (errors: number[]): number => errors.sort((a, b) => a - b)[Math.floor(0.95 * errors.length)];
  return {
    falsePeaks,
    missed: spectra - lineErrors.length,
    lineError: point(lineErrors),
    levelError: point(levelErrors),
  };
}

/** The peak within a line of a frequency. */
export function nearest(peaks: readonly Peak[], line: number): Peak | undefined {
  return peaks.find((peak) => Math.abs(peak.line - line) < 1);
}
