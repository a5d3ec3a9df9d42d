import { describe, expect, it } from 'vitest';
import { findPeaks } from '../../src/signal/peaks.ts';
import { leastBandLines, type WindowName, windowNames } from '../../src/signal/window.ts';
import { colouredNoise } from './coloured-noise.ts';
import { addTone, levelOverWhite, nearest, samplesOf, searchPeaks, type Trial } from './peak-trials.ts';
import { seededRandom } from './random.ts';

const seed = 20261201;
const segmentSamples = 1024;
const half = segmentSamples / 2;
const trialOf = (window: WindowName, averages: number, overlapPercent = 50): Trial => ({
  window,
  segmentSamples,
  overlapPercent,
  averages,
});

describe('a pure tone', () => {
  const tones = windowNames.flatMap((window) => [1, 9].map((averages) => [window, averages] as const));
  it.each(tones)(
    '%s, %i averages: reads true to 0.02 line and half a percent, alone, at any place allowed',
    (window, averages) => {
      const random = seededRandom(seed);
      const trial = trialOf(window, averages);
      // Under the rectangular window the mirror image leaks everywhere, and near a line its sign cannot be told.
      const rectangular = window === 'rectangular';
      const edge = rectangular ? 30 : leastBandLines(window);
      for (let t = 0; t < 60; t++) {
        const within = [3, 3, half - 2 * edge][t % 3] * random.uniform();
        const line = t % 3 === 1 ? half - edge - within : edge + within;
        const samples = new Float64Array(samplesOf(trial));
        addTone(samples, trial, line, 2, 2 * Math.PI * random.uniform());
        const { peaks } = searchPeaks(samples, trial);
        expect(peaks).toHaveLength(1);
        expect(peaks[0].kind).toBe('tone');
        expect(Math.abs(peaks[0].line - line)).toBeLessThan(rectangular ? 0.04 : 0.02);
        expect(Math.abs(peaks[0].level / 2 - 1)).toBeLessThan(0.005);
      }
    },
  );

  it('carries its frequency in Hz, its power and the lines it occupies', () => {
    const trial = trialOf('hann', 9);
    const samples = new Float64Array(samplesOf(trial));
    addTone(samples, trial, 100.5, 1, 0.3);
    const [peak] = searchPeaks(samples, trial).peaks;
    expect(peak.frequencyHz).toBeCloseTo(100.5 / segmentSamples, 8);
    expect(peak.level).toBeCloseTo(1, 5);
    expect(peak.power).toBeCloseTo(peak.level ** 2, 12);
    expect([peak.firstLine, peak.lastLine]).toEqual([99, 102]);
    expect(peak.aboveFloorDb).toBeGreaterThan(80);
  });

  it('on a line in white noise stands as far over the floor as it was made', () => {
    const trial = trialOf('hann', 31);
    const samples = colouredNoise('white', seededRandom(seed), samplesOf(trial));
    addTone(samples, trial, 200, levelOverWhite(trial, 40), 1);
    const { peaks, floor } = searchPeaks(samples, trial);
    expect(peaks[0].aboveFloorDb).toBeGreaterThan(39);
    expect(peaks[0].aboveFloorDb).toBeLessThan(41);
    expect(peaks[0].floorDensity).toBe(floor[200]);
    expect(peaks[0].floorDensity / 2).toBeGreaterThan(0.9);
    expect(peaks[0].floorDensity / 2).toBeLessThan(1.1);
  });
});

describe('two tones six lines apart', () => {
  const pairs = windowNames.flatMap((window) => [0, 20].map((db) => [window, db] as const));
  it.each(pairs)('%s, %i dB unequal: are told apart', (window, db) => {
    const random = seededRandom(seed);
    const spectra = 60;
    let both = 0;
    for (let t = 0; t < spectra; t++) {
      const trial = trialOf(window, [1, 9, 31][t % 3]);
      const samples = colouredNoise('white', random, samplesOf(trial)).map((value) => 1e-3 * value);
      const line = 30 + random.uniform() * 400;
      addTone(samples, trial, line, 1, 2 * Math.PI * random.uniform());
      addTone(samples, trial, line + 6, 10 ** (-db / 20), 2 * Math.PI * random.uniform());
      const { peaks } = searchPeaks(samples, trial);
      const first = nearest(peaks, line);
      const second = nearest(peaks, line + 6);
      if (first?.kind === 'tone' && second?.kind === 'tone') both++;
    }
    // 20 dB down, a tone between two lines is within 3 dB of the rectangular window's side lobe six lines off.
    expect(both / spectra).toBeGreaterThanOrEqual(window === 'rectangular' ? (db === 20 ? 0.85 : 0.95) : 1);
  });
});

describe('what is not a tone', () => {
  it('a tone whose frequency wanders over ten lines is one hump, with all its power', () => {
    const trial = trialOf('hann', 31);
    const samples = colouredNoise('white', seededRandom(seed), samplesOf(trial)).map((value) => 0.01 * value);
    let angle = 0;
    for (let n = 0; n < samples.length; n++) {
      angle += (2 * Math.PI * (195 + (10 * n) / samples.length)) / segmentSamples;
      samples[n] += Math.SQRT2 * Math.cos(angle);
    }
    const { peaks } = searchPeaks(samples, trial);
    expect(peaks[0].kind).toBe('hump');
    expect(peaks[0].level).toBeGreaterThan(0.95);
    expect(peaks[0].level).toBeLessThan(1.05);
    expect(Math.abs(peaks[0].line - 200)).toBeLessThan(1);
    expect(peaks.filter((peak) => Math.abs(peak.line - 200) < 20)).toHaveLength(1);
  });

  it('the strong tone inside the main lobe of 0 is no peak, and neither are its side lobes', () => {
    const trial = trialOf('hann', 31);
    const samples = colouredNoise('white', seededRandom(seed), samplesOf(trial));
    addTone(samples, trial, 1.6, levelOverWhite(trial, 80), 1);
    expect(searchPeaks(samples, trial).peaks).toEqual([]);
  });

  it('silence, a constant and a recording too short for a segment give no peaks', () => {
    const trial = trialOf('hann', 9);
    expect(searchPeaks(new Float64Array(samplesOf(trial)), trial).peaks).toEqual([]);
    expect(searchPeaks(new Float64Array(samplesOf(trial)).fill(5), trial).peaks).toEqual([]);
    const settings = { ...trial, averages: 0, hopSamples: half, sampleRateHz: 1 };
    expect(findPeaks(new Float64Array(half + 1).fill(Number.NaN), settings).peaks).toEqual([]);
  });

  it('a density that does not belong to the segment is refused', () => {
    const settings = { ...trialOf('hann', 9), hopSamples: half, sampleRateHz: 1 };
    expect(() => findPeaks(new Float64Array(100), settings)).toThrow('density of 100 lines');
  });
});

it('peaks come strongest first, at most 200', () => {
  const trial = { window: 'hann', segmentSamples: 8192, overlapPercent: 50, averages: 5 } as const;
  const samples = colouredNoise('white', seededRandom(seed), samplesOf(trial)).map((value) => 1e-4 * value);
  for (let k = 0; k < 300; k++) addTone(samples, trial, 40 + 13 * k, 1 + k / 300, k);
  const { peaks } = searchPeaks(samples, trial);
  expect(peaks).toHaveLength(200);
  for (let i = 1; i < 200; i++) expect(peaks[i].level).toBeLessThanOrEqual(peaks[i - 1].level);
  expect(peaks[0].level).toBeGreaterThan(1.98);
});
