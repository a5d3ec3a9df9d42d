import { describe, expect, it } from 'vitest';
import { windowNames } from '../../src/signal/window.ts';
import type { Colour } from './coloured-noise.ts';
import { falsePeaksInNoise, toneInNoise } from './peak-trials.ts';
import { seededRandom } from './random.ts';

const seed = 20261201;
const segmentSamples = 2048;
const spectra = 200;
const overlaps = [0, 25, 50, 75, 90, 95];
const settings: (readonly [number, number])[] = [[1, 0]];
for (const averages of [3, 5, 31]) for (const overlap of overlaps) settings.push([averages, overlap]);

/**
 * No setting may lie above 0.15 by more than chance (two deviations of a count over so many spectra), nor the mean
 * over all overlaps and averages above it at all.
 */
function expectFew(rates: readonly number[]): void {
  expect(Math.max(...rates)).toBeLessThanOrEqual(0.15 + 2 * Math.sqrt(0.15 / spectra));
  expect(rates.reduce((sum, rate) => sum + rate, 0) / rates.length).toBeLessThanOrEqual(0.15);
}

describe('false peaks a spectrum at the setting 0.1', () => {
  const colours: Colour[] = ['white', 'pink', 'red', 'low-passed'];
  const cases = colours.flatMap((colour) => windowNames.map((window) => [colour, window] as const));
  it.each(cases)('%s noise, %s: at most 0.15 at every overlap and number of averages', (colour, window) => {
    const random = seededRandom(seed);
    const rates = settings.map(([averages, overlapPercent]) => {
      const trial = { window, segmentSamples, overlapPercent, averages };
      return falsePeaksInNoise(trial, colour, random, spectra) / spectra;
    });
    console.log(
      colour,
      window,
      settings.map(([k, overlap], i) => `K${k}/${overlap}: ${rates[i].toFixed(3)}`).join('  '),
    );
    expectFew(rates);
  });

  const tones = windowNames.flatMap((window) => [30, 50, 65, 80].map((db) => [window, db] as const));
  it.each(tones)('%s: beside a tone %i dB over the floor at most 0.15', (window, db) => {
    const random = seededRandom(seed);
    const rates = settings.map(([averages, overlapPercent]) => {
      const trial = { window, segmentSamples, overlapPercent, averages };
      return toneInNoise(trial, db, random, spectra).falsePeaks / spectra;
    });
    console.log(
      window,
      db,
      settings.map(([k, overlap], i) => `K${k}/${overlap}: ${rates[i].toFixed(3)}`).join('  '),
    );
    expectFew(rates);
  });
});

it.each(windowNames)(
  '%s: 95 of 100 tones 40 dB up, 31 averages, read true to 0.02 line and half a percent',
  (window) => {
    const trials = toneInNoise(
      { window, segmentSamples, overlapPercent: 50, averages: 31 },
      40,
      seededRandom(seed),
      2000,
    );
    console.log(window, `${trials.lineError.toFixed(4)} line, ${(100 * trials.levelError).toFixed(3)} %`);
    expect(trials.missed).toBe(0);
    expect(trials.lineError).toBeLessThan(0.02);
    expect(trials.levelError).toBeLessThan(0.005);
  },
);
