import { describe, expect, it } from 'vitest';
import { averageDensity } from '../../src/signal/averaging.ts';
import { noiseFloor, usableLines } from '../../src/signal/floor.ts';
import { binsOf, runningMedian } from '../../src/signal/running-median.ts';
import { windowNames } from '../../src/signal/window.ts';
import { type Colour, colouredNoise } from './coloured-noise.ts';
import { addTone, levelOverWhite, samplesOf, type Trial } from './peak-trials.ts';
import { seededRandom } from './random.ts';

const seed = 20261201;
const segmentSamples = 2048;

function floorOf(samples: Float64Array, trial: Trial): Float64Array {
  const averaged = averageDensity(samples, { ...trial, sampleRateHz: 1 });
  return noiseFloor(averaged.density, { ...trial, hopSamples: averaged.hopSamples }, 1e-4).floor;
}

/** Mean over many spectra of the floor over the mean density of the same noise, at some lines. */
function floorOverMean(colour: Colour, trial: Trial, lines: number[], spectra: number): number[] {
  const random = seededRandom(seed);
  const floors = new Float64Array(segmentSamples / 2 + 1);
  const means = new Float64Array(segmentSamples / 2 + 1);
  for (let t = 0; t < spectra; t++) {
    const samples = colouredNoise(colour, random, samplesOf(trial));
    const { density } = averageDensity(samples, { ...trial, sampleRateHz: 1 });
    const floor = floorOf(samples, trial);
    for (let k = 0; k < floor.length; k++) {
      floors[k] += floor[k];
      means[k] += density[k];
    }
  }
  return lines.map((line) => {
    let floor = 0;
    let mean = 0;
    for (let k = line - 2; k <= line + 2; k++) {
      floor += floors[k];
      mean += means[k];
    }
    return floor / mean;
  });
}

describe('running median', () => {
  it('is within 0.5 % of the sorted middle of every window, narrower ones near the ends', () => {
    const random = seededRandom(seed);
    const values = Float64Array.from({ length: 700 }, () => 1e-9 * -Math.log(1 - random.uniform()));
    const medians = runningMedian(binsOf(values), 40, 15);
    for (let i = 0; i < values.length; i++) {
      const centre = Math.min(values.length - 16, Math.max(15, i));
      const side = Math.min(40, centre, values.length - 1 - centre);
      const middle = values.slice(centre - side, centre + side + 1).sort()[side];
      expect(Math.abs(medians[i] / middle - 1)).toBeLessThan(0.005);
    }
  });

  it('is exact on a slope, for any reach', () => {
    const values = Float64Array.from({ length: 1000 }, (_, i) => 1000 + i);
    const medians = runningMedian(binsOf(values), 150, 15);
    for (let i = 15; i < 985; i++) expect(Math.abs(medians[i] / values[i] - 1)).toBeLessThan(0.006);
  });

  it('of few values is their common median, of none nothing', () => {
    expect(Array.from(runningMedian(binsOf(Float64Array.of(4, 1, 2)), 150, 15), Math.round)).toEqual([
      2, 2, 2,
    ]);
    expect(runningMedian(binsOf(new Float64Array(0)), 150, 15)).toHaveLength(0);
  });
});

describe('noise floor', () => {
  it.each([1, 3, 31])('of white noise, %i averages, is its mean density without bias', (averages) => {
    const trial: Trial = { window: 'hann', segmentSamples, overlapPercent: 50, averages };
    const lines = Array.from({ length: 150 }, (_, i) => 150 + 5 * i);
    const ratios = floorOverMean('white', trial, lines, 30);
    const mean = ratios.reduce((sum, ratio) => sum + ratio, 0) / ratios.length;
    expect(Math.abs(mean - 1)).toBeLessThan(0.04);
  });

  it.each(['pink', 'red'] as const)('follows %s noise from the lowest lines on within 3 dB', (colour) => {
    const trial: Trial = { window: 'hann', segmentSamples, overlapPercent: 50, averages: 31 };
    for (const ratio of floorOverMean(colour, trial, [6, 12, 25, 100, 500, 1000], 12)) {
      expect(Math.abs(10 * Math.log10(ratio))).toBeLessThan(3);
    }
  });

  it('follows the cliff of an anti-aliasing filter within 3 dB', () => {
    const trial: Trial = { window: 'hann', segmentSamples, overlapPercent: 50, averages: 31 };
    for (const ratio of floorOverMean('low-passed', trial, [700, 800, 850, 900, 950], 12)) {
      expect(Math.abs(10 * Math.log10(ratio))).toBeLessThan(3);
    }
  });

  it.each(windowNames)('%s: a family of harmonics 40 dB up, every 20 lines, hardly lifts it', (window) => {
    const trial: Trial = { window, segmentSamples, overlapPercent: 50, averages: 31 };
    const noise = colouredNoise('white', seededRandom(seed), samplesOf(trial));
    const without = floorOf(noise, trial);
    for (let k = 1; k <= 40; k++) addTone(noise, trial, 20 * k, levelOverWhite(trial, 40), k);
    const lifted = floorOf(noise, trial);
    // Under the rectangular window their leakage is part of the floor.
    const mostDb = window === 'rectangular' ? 3 : 1;
    for (const line of [50, 210, 410, 610])
      expect(Math.abs(10 * Math.log10(lifted[line] / without[line]))).toBeLessThan(mostDb);
  });

  it('leaves out the main lobes of 0 and Nyquist, and copes with segments that have few lines or none', () => {
    for (const window of windowNames) {
      for (const few of [8, 16, 64, 256]) {
        const shape = { window, segmentSamples: few, hopSamples: few / 2, averages: 5 };
        const { floor } = noiseFloor(new Float64Array(few / 2 + 1).fill(1), shape, 0.01);
        const { firstLine, lastLine } = usableLines(shape);
        floor.forEach((value, line) => {
          if (line < firstLine || line > lastLine) expect(value).toBe(0);
          else expect(Math.abs(value - 1)).toBeLessThan(0.2);
        });
      }
    }
  });
});
