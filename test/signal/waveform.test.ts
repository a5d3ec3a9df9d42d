import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { Waveform, waveformValues } from '../../src/signal/waveform.ts';
import { type GoldenInput, goldenSamples } from './golden-samples.ts';
import { gaussianNoise, seededRandom } from './random.ts';

/** `count` samples of a function of the phase, a whole number of periods that no sample pattern repeats in. */
function periods(count: number, shape: (phase: number) => number): Float64Array {
  return Float64Array.from({ length: count }, (_, n) => shape(((n + 0.5) * 7) / count));
}

describe('exact values of known shapes', () => {
  const saw = (phase: number) => 2 * (phase - Math.floor(phase)) - 1;
  test.each([
    ['sine', Math.SQRT2, 1.5, (p: number) => Math.sin(2 * Math.PI * p)],
    ['square', 1, 1, (p: number) => Math.sign(saw(p))],
    ['triangle', Math.sqrt(3), 1.8, (p: number) => 2 * Math.abs(saw(p)) - 1],
    ['sawtooth', Math.sqrt(3), 1.8, saw],
  ])('%s: crest factor %f, kurtosis %f', (_, crest, kurtosis, shape) => {
    const values = waveformValues(periods(70_000, shape));
    expect(values.crestFactor).toBeCloseTo(crest, 3);
    expect(values.kurtosis).toBeCloseTo(kurtosis, 3);
    expect(Math.abs(values.skewness)).toBeLessThan(1e-3);
  });

  test('impulses of both signs in one sample of a hundred: crest factor 10, kurtosis 100', () => {
    const samples = new Float64Array(20_000);
    for (let n = 0; n < 20_000; n += 100) samples[n] = n % 200 === 0 ? 1 : -1;
    const values = waveformValues(samples);
    expect(values.crestFactor).toBeCloseTo(10, 12);
    expect(values.kurtosis).toBeCloseTo(100, 10);
  });

  test('Gaussian noise: kurtosis 3 and skewness 0 within four standard errors', () => {
    const count = 100_000;
    const values = waveformValues(gaussianNoise(seededRandom(3), count, 0.2));
    expect(Math.abs(values.kurtosis - 3)).toBeLessThan(4 * Math.sqrt(24 / count));
    expect(Math.abs(values.skewness)).toBeLessThan(4 * Math.sqrt(6 / count));
    expect(Math.abs(values.rms - 0.2)).toBeLessThan((4 * 0.2) / Math.sqrt(2 * count));
  });

  test('worked by hand: 0 0 0 4 has mean 1, variance 3, third moment 6, fourth 21', () => {
    const values = waveformValues(Float64Array.of(0, 0, 0, 4));
    expect(values.mean).toBe(1);
    expect(values.rms).toBeCloseTo(Math.sqrt(3), 15);
    expect(values.peak).toBe(3);
    expect(values.skewness).toBeCloseTo(6 / 3 ** 1.5, 14);
    expect(values.kurtosis).toBeCloseTo(21 / 9, 14);
  });

  test('the peak is measured from the mean, on whichever side it lies', () => {
    expect(waveformValues(Float64Array.of(10, 10, 10, 4)).peak).toBeCloseTo(4.5, 14);
  });
});

test('agree with SciPy to 1e-12, with a mean of up to ten million times the r.m.s. too', () => {
  const golden = JSON.parse(readFileSync(new URL('../golden/waveform.json', import.meta.url), 'utf8')) as {
    cases: (GoldenInput & Record<string, number>)[];
  };
  expect(golden.cases).toHaveLength(28);
  for (const entry of golden.cases) {
    const values = waveformValues(goldenSamples(entry.samples, entry));
    const where = `offset ${entry.offset}, ${entry.samples} samples`;
    const close = (value: number, expected: number, name: string) =>
      expect(Math.abs(value - expected), `${name}, ${where}`).toBeLessThanOrEqual(1e-12 * Math.abs(expected));
    close(values.mean, entry.mean, 'mean');
    close(values.rms, entry.rms, 'rms');
    close(values.peak, entry.peak, 'peak');
    close(values.crestFactor, entry.crest_factor, 'crest factor');
    close(values.kurtosis, entry.kurtosis, 'kurtosis');
    close(values.skewness, entry.skewness, 'skewness');
  }
});

describe('feeding in blocks', () => {
  test('gives bit for bit the same, whatever the size of the blocks', () => {
    const samples = gaussianNoise(seededRandom(8), 10_000).map((x) => 10 + 0.01 * x);
    const whole = waveformValues(samples);
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 0, max: 5000 }), { maxLength: 10 }), (sizes) => {
        const waveform = new Waveform();
        let start = 0;
        for (const size of sizes) {
          waveform.add(samples.subarray(start, start + size));
          start = Math.min(samples.length, start + size);
        }
        waveform.add(samples.subarray(start));
        expect(waveform.finish()).toEqual(whole);
      }),
      { seed: 20261201, numRuns: 50 },
    );
  });

  test('merged blocks are what two plain passes over everything give', () => {
    // A level that changes from block to block makes every term of the merging count.
    const random = seededRandom(9);
    const samples = Float64Array.from({ length: 4096 * 5 + 777 }, (_, n) => {
      const block = Math.floor(n / 4096);
      return block ** 2 + (1 + block) * random.uniform() ** 2;
    });
    const n = samples.length;
    const mean = samples.reduce((sum, x) => sum + x, 0) / n;
    const [m2, m3, m4] = [2, 3, 4].map((p) => samples.reduce((sum, x) => sum + (x - mean) ** p, 0) / n);
    const values = waveformValues(samples);
    expect(values.mean / mean).toBeCloseTo(1, 13);
    expect(values.rms / Math.sqrt(m2)).toBeCloseTo(1, 13);
    expect(values.skewness / (m3 / m2 ** 1.5)).toBeCloseTo(1, 12);
    expect(values.kurtosis / (m4 / m2 ** 2)).toBeCloseTo(1, 12);
  });
});

describe('nothing to measure', () => {
  test('a flat signal has no shape, at any value', () => {
    for (const value of [0, 0.1, -1e9 / 3]) {
      const values = waveformValues(new Float64Array(5000).fill(value));
      expect(values).toEqual({
        mean: value,
        rms: 0,
        peak: 0,
        crestFactor: Number.NaN,
        kurtosis: Number.NaN,
        skewness: Number.NaN,
      });
    }
  });

  test('a single sample is flat, none is nothing', () => {
    expect(waveformValues(Float64Array.of(3))).toMatchObject({ mean: 3, rms: 0, peak: 0 });
    expect(Object.values(waveformValues(new Float64Array(0))).every(Number.isNaN)).toBe(true);
  });
});
