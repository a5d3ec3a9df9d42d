import { describe, expect, it } from 'vitest';
import { windowNames } from '../../src/signal/window.ts';
import type { Colour } from './coloured-noise.ts';
import { falsePeaksInNoise, toneInNoise } from './peak-trials.ts';
import { seededRandom } from './random.ts';

const seed = 20261201;
const segmentSamples = 1024;
const cases = [
  [1, 0],
  [3, 0],
  [3, 75],
  [5, 50],
  [5, 95],
  [31, 25],
  [31, 50],
  [31, 90],
] as const;

describe('peaks in noise (seed 20261201; all settings in peaks.long.ts)', () => {
  const colours: Colour[] = ['white', 'pink', 'red'];
  it.each(windowNames)('%s: noise of any colour alone gives at most 0.15 peaks a spectrum', (window) => {
    const random = seededRandom(seed);
    const spectra = 12;
    let found = 0;
    for (const colour of colours) {
      for (const [averages, overlapPercent] of cases) {
        found += falsePeaksInNoise(
          { window, segmentSamples, overlapPercent, averages },
          colour,
          random,
          spectra,
        );
      }
    }
    expect(found / (spectra * cases.length * colours.length)).toBeLessThanOrEqual(0.15);
  });

  it.each(windowNames)(
    '%s: a tone 30 to 80 dB over the floor is found and brings no false peaks with it',
    (window) => {
      const random = seededRandom(seed);
      const spectra = 12;
      let found = 0;
      for (const overFloorDb of [30, 50, 80]) {
        for (const [averages, overlapPercent] of cases) {
          const trials = toneInNoise(
            { window, segmentSamples, overlapPercent, averages },
            overFloorDb,
            random,
            spectra,
          );
          // The rectangular window's own leakage is the floor beside a strong tone between two lines.
          expect(trials.missed).toBeLessThanOrEqual(window === 'rectangular' ? 1 : 0);
          found += trials.falsePeaks;
        }
      }
      expect(found / (spectra * cases.length * 3)).toBeLessThanOrEqual(0.15);
    },
  );

  it.each(windowNames)(
    '%s: of tones 40 dB over the floor, 31 averages, 95 in 100 read true to 0.02 line and half a percent',
    (window) => {
      const trial = { window, segmentSamples, overlapPercent: 50, averages: 31 };
      const trials = toneInNoise(trial, 40, seededRandom(seed), 60);
      expect(trials.missed).toBe(0);
      expect(trials.lineError).toBeLessThan(0.02);
      expect(trials.levelError).toBeLessThan(0.005);
    },
  );
});
