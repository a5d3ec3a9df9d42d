import type { WindowName } from '../../src/signal/window.ts';
import { addTone, levelOverWhite, samplesOf, searchPeaks, type Trial } from './peak-trials.ts';
import { gaussianNoise, type SeededRandom } from './random.ts';

/**
 * Trials of 100 in which both of two tones are found within half a line: so many lines apart, the second by so many dB
 * below the first and 40 dB over the floor.
 */
export function toldApart(
  window: WindowName,
  apart: { readonly lines: number; readonly db: number; readonly averages: number },
  random: SeededRandom,
  trials: number,
): number {
  const trial: Trial = { window, segmentSamples: 1024, overlapPercent: 50, averages: apart.averages };
  const weaker = levelOverWhite(trial, 40);
  const stronger = weaker * 10 ** (apart.db / 20);
  let both = 0;
  for (let t = 0; t < trials; t++) {
    const samples = gaussianNoise(random, samplesOf(trial));
    const first = 100 + 200 * random.uniform();
    const second = first + (random.uniform() < 0.5 ? -1 : 1) * apart.lines;
    addTone(samples, trial, first, stronger, 2 * Math.PI * random.uniform());
    addTone(samples, trial, second, weaker, 2 * Math.PI * random.uniform());
    const { peaks } = searchPeaks(samples, trial);
    const found = [first, second].map((line) => peaks.find((peak) => Math.abs(peak.line - line) < 0.5));
    if (found[0] !== undefined && found[1] !== undefined && found[0] !== found[1]) both++;
  }
  return (100 * both) / trials;
}
