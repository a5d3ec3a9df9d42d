/** What is taken off segments, and the averages besides the mean: median over segments, highest of segments. */
import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { type AveragingSettings, averageDensity } from '../../src/signal/averaging.ts';
import { MedianAverage, medianBias, medianNoise } from '../../src/signal/median-average.ts';
import { PeakHold } from '../../src/signal/peak-hold.ts';
import { logUpperTail } from '../../src/signal/quadratic-form.ts';
import { type WindowName, windowNames } from '../../src/signal/window.ts';
import { type GoldenInput, goldenSamples } from './golden-samples.ts';
import { gaussianNoise, seededRandom } from './random.ts';

interface Golden {
  sample_rate_hz: number;
  input: GoldenInput;
  lines: Record<string, number[]>;
  cases: {
    window: WindowName;
    segment_samples: number;
    overlap_percent: number;
    detrend: 'constant' | 'linear';
    average: 'mean' | 'median';
    samples: number;
    largest: number;
    density: number[];
  }[];
}

const golden: Golden = JSON.parse(readFileSync(new URL('../golden/averaging.json', import.meta.url), 'utf8'));

function medianOf(samples: Float64Array, settings: AveragingSettings): Float64Array {
  const median = new MedianAverage(settings.segmentSamples / 2 + 1);
  averageDensity(samples, settings, (density) => median.add(density));
  return median.finish().density;
}

describe.each(windowNames)('%s agrees with SciPy', (window) => {
  const samples = goldenSamples(2048 * 6, golden.input);
  const cases = golden.cases.filter((entry) => entry.window === window);
  test.each(['mean', 'median'] as const)('%s, with means or straight lines taken off', (average) => {
    const chosen = cases.filter((entry) => entry.average === average);
    expect(chosen).toHaveLength(6);
    for (const entry of chosen) {
      const settings: AveragingSettings = {
        window,
        segmentSamples: entry.segment_samples,
        overlapPercent: entry.overlap_percent,
        sampleRateHz: golden.sample_rate_hz,
        detrend: entry.detrend === 'linear' ? 'linear' : 'mean',
      };
      const part = samples.subarray(0, entry.samples);
      const density = average === 'mean' ? averageDensity(part, settings).density : medianOf(part, settings);
      golden.lines[entry.segment_samples].forEach((line, i) => {
        const error = Math.abs(density[line] - entry.density[i]);
        const where = `${entry.segment_samples} samples, ${entry.overlap_percent} %, line ${line}`;
        expect(error, where).toBeLessThanOrEqual(Math.max(1e-9 * entry.density[i], 1e-14 * entry.largest));
      });
    }
  });
});

describe('a straight line taken off each segment', () => {
  const settings: AveragingSettings = {
    window: 'hann',
    segmentSamples: 64,
    overlapPercent: 50,
    sampleRateHz: 64,
    detrend: 'linear',
  };

  test('a pure drift leaves nothing, while only its mean taken off leaves the lowest lines full of it', () => {
    for (const count of [64, 96, 160]) {
      const drift = Float64Array.from({ length: count }, (_, n) => 5 - 0.25 * n);
      const { density } = averageDensity(drift, settings);
      for (const value of density) expect(value).toBeLessThan(1e-24);
      expect(averageDensity(drift, { ...settings, detrend: 'mean' }).density[1]).toBeGreaterThan(0.1);
    }
  });

  test('any drift and offset, added to any samples, changes nothing; an odd last segment included', () => {
    const cases = fc.record({
      drift: fc.double({ min: -1, max: 1, noNaN: true }),
      offset: fc.double({ min: -100, max: 100, noNaN: true }),
      extra: fc.integer({ min: 0, max: 130 }),
      seed: fc.nat(),
    });
    fc.assert(
      fc.property(cases, ({ drift, offset, extra, seed }) => {
        const plain = gaussianNoise(seededRandom(seed), 64 + extra);
        const drifting = plain.map((x, n) => x + offset + drift * n);
        const expected = averageDensity(plain, settings).density;
        averageDensity(drifting, settings).density.forEach((value, k) => {
          expect(Math.abs(value - expected[k])).toBeLessThan(1e-9 * expected[k] + 1e-13);
        });
      }),
      { seed: 20261201, numRuns: 100 },
    );
  });
});

describe('the median over segments', () => {
  test('of noise is divided by 1 - 1/2 + 1/3 - ...: 1, 1, 5/6, 5/6, 47/60, towards ln 2', () => {
    const expected = [1, 1, 5 / 6, 5 / 6, 47 / 60, 47 / 60];
    expected.forEach((value, i) => {
      expect(medianBias(i + 1)).toBeCloseTo(value, 14);
    });
    expect(medianBias(100_001)).toBeCloseTo(Math.LN2, 5);
    expect(() => medianBias(0)).toThrow('segments = 0');
  });

  test('its noise has exactly the distribution of the middle one of K exponentials', () => {
    // P(median of three > x) = 3 q² - 2 q³ with q = exp(-x).
    for (const x of [0.1, 0.7, 2, 5]) {
      const q = Math.exp(-x * medianBias(3));
      expect(Math.exp(logUpperTail(medianNoise(3), x))).toBeCloseTo(3 * q ** 2 - 2 * q ** 3, 9);
    }
    for (const segments of [2, 4, 9]) {
      const { weights } = medianNoise(segments);
      expect(weights.reduce((sum, weight) => sum + weight, 0)).toBeCloseTo(1, 14);
    }
    // Two: their mean, whose variance is half of one's. Four, simulated with the seed stated.
    expect(medianNoise(2).weights.reduce((sum, weight) => sum + weight ** 2, 0)).toBeCloseTo(0.5, 14);
    const random = seededRandom(20261201);
    const squares = Array.from({ length: 40_000 }, () => {
      const four = Array.from({ length: 4 }, () => -Math.log(1 - random.uniform())).sort((a, b) => a - b);
      return ((four[1] + four[2]) / 2 / medianBias(4) - 1) ** 2;
    });
    const variance = squares.reduce((sum, square) => sum + square, 0) / squares.length;
    const exact = medianNoise(4).weights.reduce((sum, weight) => sum + weight ** 2, 0);
    expect(Math.abs(variance / exact - 1)).toBeLessThan(0.03);
  });

  test('two knocked segments in nine leave the noise as it was, where their mean is thrown up', () => {
    const settings = { window: 'hann', segmentSamples: 256, overlapPercent: 0, sampleRateHz: 256 } as const;
    const samples = gaussianNoise(seededRandom(3), 256 * 9);
    for (let n = 256; n < 768; n++) samples[n] *= 30;
    const level = (density: Float64Array) =>
      density.subarray(10, 120).reduce((sum, value) => sum + value, 0) / 110 / (2 / 256);
    expect(level(averageDensity(samples, settings).density)).toBeGreaterThan(150);
    expect(level(medianOf(samples, settings))).toBeGreaterThan(0.8);
    // The median is now the middle of seven plus two that are always above: 1.5 times that of all nine.
    expect(level(medianOf(samples, settings))).toBeLessThan(1.7);
  });

  test('of more segments than are kept takes them evenly over the recording', () => {
    const median = new MedianAverage(1);
    for (let n = 0; n < 1000; n++) median.add(Float64Array.of(n));
    const { density, segments } = median.finish();
    expect(segments).toBeGreaterThan(63);
    expect(segments).toBeLessThanOrEqual(127);
    // Evenly spaced numbers from 0: their median is the middle of the recording.
    expect(density[0] * medianBias(segments)).toBeGreaterThan(480);
    expect(density[0] * medianBias(segments)).toBeLessThan(520);
    expect(new MedianAverage(3).finish().density).toEqual(new Float64Array(3).fill(Number.NaN));
  });
});

test('peak-hold keeps the highest of each line over the segments', () => {
  const hold = new PeakHold(3);
  hold.add(Float64Array.of(1, 5, 0));
  hold.add(Float64Array.of(2, 3, 0));
  expect(hold.finish()).toEqual(Float64Array.of(2, 5, 0));
});
