/** Peaks that are looked for in the median over segments, seed 20261201. */
import { describe, expect, test } from 'vitest';
import { averageDensity, hopSamples } from '../../src/signal/averaging.ts';
import { MedianAverage, medianStride } from '../../src/signal/median-average.ts';
import { findPeaks } from '../../src/signal/peaks.ts';
import type { WindowName } from '../../src/signal/window.ts';
import { addTone, levelOverWhite, nearest } from './peak-trials.ts';
import { gaussianNoise, seededRandom } from './random.ts';

const segmentSamples = 1024;

function bothSearches(samples: Float64Array, window: WindowName, overlapPercent: number) {
  const settings = { window, segmentSamples, overlapPercent, sampleRateHz: 1 };
  const hop = hopSamples(segmentSamples, overlapPercent);
  const median = new MedianAverage(segmentSamples / 2 + 1, medianStride(window, segmentSamples, hop));
  const { density, averages } = averageDensity(samples, settings, (segment) => median.add(segment));
  const shape = { ...settings, hopSamples: hop, averages };
  return {
    inMean: findPeaks(density, shape),
    inMedian: findPeaks(density, { ...shape, searchIn: median.finish() }),
  };
}

test('noise alone: at most 0.15 peaks a spectrum, with knocked segments or none', () => {
  const random = seededRandom(20261201);
  let found = 0;
  let spectra = 0;
  for (const window of ['hann', 'hamming', 'rectangular', 'flat-top'] as const) {
    for (const averages of [3, 4, 9, 31]) {
      for (const knocked of [false, true]) {
        for (let t = 0; t < 12; t++) {
          const samples = gaussianNoise(random, segmentSamples * (1 + (averages - 1) / 2));
          if (knocked && averages > 4) for (let n = 2000; n < 2300; n++) samples[n] *= 20;
          found += bothSearches(samples, window, 50).inMedian.peaks.length;
          spectra++;
        }
      }
    }
  }
  expect(found / spectra).toBeLessThanOrEqual(0.15);
});

describe('a tone 20 dB over the floor', () => {
  const trial = { window: 'hann', segmentSamples, overlapPercent: 50, averages: 15 } as const;
  const level = levelOverWhite(trial, 20);
  const recorded = (seed: number, knock: number) => {
    const samples = gaussianNoise(seededRandom(seed), segmentSamples * 8);
    for (let n = 3000; n < 3500; n++) samples[n] *= knock;
    addTone(samples, trial, 150.3, level, 1);
    return bothSearches(samples, 'hann', 50);
  };

  test('is found in the median alone, when a knock fills the mean with maxima that look like peaks', () => {
    const others = { inMean: 0, inMedian: 0 };
    let found = 0;
    for (let seed = 1; seed <= 30; seed++) {
      const { inMean, inMedian } = recorded(seed, 12);
      if (nearest(inMedian.peaks, 150.3) !== undefined) found++;
      others.inMean += inMean.peaks.length - (nearest(inMean.peaks, 150.3) === undefined ? 0 : 1);
      others.inMedian += inMedian.peaks.length - (nearest(inMedian.peaks, 150.3) === undefined ? 0 : 1);
    }
    expect(found).toBe(30);
    expect(others.inMean).toBeGreaterThan(60);
    expect(others.inMedian).toBeLessThanOrEqual(5);
  });

  test('has the same level whichever average it is looked for in, and the same height over the floor', () => {
    for (let seed = 1; seed <= 10; seed++) {
      const { inMean, inMedian } = recorded(seed, 1);
      const [a, b] = [inMean, inMedian].map(({ peaks }) => nearest(peaks, 150.3));
      expect(b?.level).toBe(a?.level);
      expect(b?.frequencyHz).toBe(a?.frequencyHz);
      expect(Math.abs((b?.aboveFloorDb ?? 0) - (a?.aboveFloorDb ?? 0))).toBeLessThan(0.7);
    }
  });

  test('the floor is the same within a few percent, where nothing knocks', () => {
    const { inMean, inMedian } = recorded(3, 1);
    for (const line of [50, 250, 450]) {
      expect(Math.abs(inMedian.floor[line] / inMean.floor[line] - 1)).toBeLessThan(0.12);
    }
  });
});

test('the side lobes of a tone 90 dB over the floor are not taken for peaks', () => {
  const random = seededRandom(20261201);
  let others = 0;
  for (const window of ['hamming', 'flat-top'] as const) {
    for (const averages of [3, 9]) {
      for (let t = 0; t < 12; t++) {
        const trial = { window, segmentSamples, overlapPercent: 50, averages };
        const samples = gaussianNoise(random, segmentSamples * (1 + (averages - 1) / 2));
        const line = 150 + random.uniform();
        addTone(samples, trial, line, levelOverWhite(trial, 90), 2 * Math.PI * random.uniform());
        const { peaks } = bothSearches(samples, window, 50).inMedian;
        expect(nearest(peaks, line)).toBeDefined();
        others += peaks.length - 1;
      }
    }
  }
  expect(others / 48).toBeLessThanOrEqual(0.15);
});
