import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import {
  Averager,
  type AveragingSettings,
  averageDensity,
  hopSamples,
  segmentsThatFit,
} from '../../src/signal/averaging.ts';
import { makeWindow, windowNames } from '../../src/signal/window.ts';
import { gaussianNoise, seededRandom } from './random.ts';

const hann8: AveragingSettings = { window: 'hann', segmentSamples: 8, overlapPercent: 50, sampleRateHz: 8 };

/** Welch's average written as its definition says, with the plain Fourier sum. */
function plainAverage(samples: Float64Array, settings: AveragingSettings): number[] {
  const { segmentSamples: length, sampleRateHz } = settings;
  const window = makeWindow(settings.window, length);
  const power = window.reduce((sum, w) => sum + w * w, 0);
  const hop = Math.max(1, Math.round(length * (1 - settings.overlapPercent / 100)));
  const density = new Array<number>(length / 2 + 1).fill(0);
  let count = 0;
  for (let start = 0; start + length <= samples.length; start += hop) {
    const segment = samples.subarray(start, start + length);
    const mean = segment.reduce((sum, x) => sum + x, 0) / length;
    for (let k = 0; k <= length / 2; k++) {
      let real = 0;
      let imaginary = 0;
      segment.forEach((x, n) => {
        real += window[n] * (x - mean) * Math.cos((2 * Math.PI * k * n) / length);
        imaginary += window[n] * (x - mean) * Math.sin((2 * Math.PI * k * n) / length);
      });
      const sides = k === 0 || k === length / 2 ? 1 : 2;
      density[k] += (sides * (real ** 2 + imaginary ** 2)) / (sampleRateHz * power);
    }
    count++;
  }
  return density.map((sum) => sum / count);
}

describe('worked by hand: 1 to 8 and back, 8 samples a second', () => {
  const samples = Float64Array.of(1, 2, 3, 4, 5, 6, 7, 8, 8, 7, 6, 5, 4, 3, 2, 1);
  test.each([
    ['rectangular', 0, 2, [0, 3.414213562373, 1, 0.585786437627, 0.25]],
    [
      'hann',
      50,
      3,
      [0.2290644539878, 1.146207110203, 0.1145161945008, 0.003031306520552, 0.0001022126788988],
    ],
    ['hann', 75, 5, [0.2156810665304, 1.159915523654, 0.1155032474434, 0.00487283680917, 0.000270713156065]],
  ] as const)('%s, overlap %i %%', (window, overlapPercent, averages, density) => {
    const result = averageDensity(samples, { ...hann8, window, overlapPercent });
    expect(result.averages).toBe(averages);
    expect(result.usedPercent).toBe(100);
    expect(result.lineSpacingHz).toBe(1);
    density.forEach((value, k) => {
      expect(Math.abs(result.density[k] - value)).toBeLessThan(1e-12 * Math.max(1, value));
    });
  });
});

describe('against a slow plain twin', () => {
  test('any window, overlap, length and samples', () => {
    const cases = fc.record({
      window: fc.constantFrom(...windowNames),
      segmentSamples: fc.constantFrom(8, 16, 32, 64),
      overlapPercent: fc.integer({ min: 0, max: 95 }),
      sampleRateHz: fc.double({ min: 0.1, max: 1e5, noNaN: true }),
      seed: fc.nat(),
      extra: fc.integer({ min: 0, max: 150 }),
      offset: fc.double({ min: -10, max: 10, noNaN: true }),
    });
    fc.assert(
      fc.property(cases, ({ seed, extra, offset, ...settings }) => {
        const random = seededRandom(seed);
        const samples = gaussianNoise(random, settings.segmentSamples + extra).map((x) => x + offset);
        const { density, averages } = averageDensity(samples, settings);
        const plain = plainAverage(samples, settings);
        const largest = Math.max(...plain);
        expect(averages).toBeGreaterThan(0);
        plain.forEach((value, k) => {
          expect(Math.abs(density[k] - value)).toBeLessThan(1e-10 * value + 1e-13 * largest);
        });
      }),
      { seed: 20261201, numRuns: 150 },
    );
  });
});

describe('feeding in blocks', () => {
  test('gives bit for bit the same, whatever the size of the blocks', () => {
    const samples = gaussianNoise(seededRandom(5), 1000);
    fc.assert(
      fc.property(
        fc.constantFrom(0, 33, 50, 75, 95),
        fc.array(fc.integer({ min: 0, max: 200 }), { minLength: 1, maxLength: 30 }),
        (overlapPercent, sizes) => {
          const settings = { ...hann8, segmentSamples: 64, overlapPercent };
          const averager = new Averager(settings);
          let start = 0;
          for (const size of sizes) {
            averager.add(samples.subarray(start, start + size));
            start = Math.min(samples.length, start + size);
          }
          averager.add(samples.subarray(start));
          expect(averager.finish()).toEqual(averageDensity(samples, settings));
        },
      ),
      { seed: 20261201, numRuns: 100 },
    );
  });

  test('a block may be overwritten as soon as it was handed over', () => {
    const samples = gaussianNoise(seededRandom(6), 300);
    const averager = new Averager({ ...hann8, segmentSamples: 32 });
    const block = new Float64Array(10);
    for (let start = 0; start < 300; start += 10) {
      block.set(samples.subarray(start, start + 10));
      averager.add(block);
      block.fill(Number.NaN);
    }
    expect(averager.finish()).toEqual(averageDensity(samples, { ...hann8, segmentSamples: 32 }));
  });
});

describe('which samples are used', () => {
  test('an impulse shows in the segment it lies in, wherever it stands, and as a flat density', () => {
    const settings = { ...hann8, window: 'rectangular', overlapPercent: 0 } as const;
    for (let position = 0; position < 24; position++) {
      const samples = new Float64Array(24);
      samples[position] = 2;
      const seen: [number, number[]][] = [];
      averageDensity(samples, settings, (density, index) => seen.push([index, [...density]]));
      expect(seen.map(([index]) => index)).toEqual([0, 1, 2]);
      for (const [index, density] of seen) {
        // |X|² is 4 on every line but 0, and fs sum w² is 64.
        const flat = index === Math.floor(position / 8) ? 4 / 64 : 0;
        [0, 2 * flat, 2 * flat, 2 * flat, flat].forEach((value, k) => {
          expect(density[k]).toBeCloseTo(value, 14);
        });
      }
    }
  });

  test('segments are seen in order, an odd last one too, and their mean is the average', () => {
    for (const averages of [1, 2, 3, 4, 7]) {
      const samples = gaussianNoise(seededRandom(averages), 8 + (averages - 1) * 4);
      const order: number[] = [];
      const sum = new Float64Array(5);
      const result = averageDensity(samples, hann8, (density, index) => {
        order.push(index);
        density.forEach((value, k) => {
          sum[k] += value;
        });
      });
      expect(order).toEqual(Array.from({ length: averages }, (_, i) => i));
      expect(result.averages).toBe(averages);
      expect(result.density).toEqual(sum.map((value) => value / averages));
    }
  });

  test('an odd last segment is bit for bit what it is alone, however loud those before were', () => {
    const samples = gaussianNoise(seededRandom(12), 24).map((x, n) => (n < 16 ? 1e9 * x : x));
    const seen: Float64Array[] = [];
    averageDensity(samples, { ...hann8, overlapPercent: 0 }, (density) => seen.push(density.slice()));
    expect(seen[2]).toEqual(averageDensity(samples.subarray(16), hann8).density);
  });

  test('what no segment reaches at the end shows in the used share', () => {
    const result = averageDensity(new Float64Array(8 + 4 + 3), hann8);
    expect(result).toMatchObject({ averages: 2, samples: 15, hopSamples: 4 });
    expect(result.usedPercent).toBe((100 * 12) / 15);
  });

  test('the shortest recording is one segment; a shorter one has no average and no number to mistake for one', () => {
    expect(averageDensity(gaussianNoise(seededRandom(1), 8), hann8).averages).toBe(1);
    for (const length of [0, 1, 7]) {
      const result = averageDensity(new Float64Array(length), hann8);
      expect(result).toMatchObject({ averages: 0, usedPercent: 0, samples: length });
      expect(result.density).toHaveLength(5);
      expect(result.density.every(Number.isNaN)).toBe(true);
    }
  });

  test('the hop is the nearest whole number of samples and never none', () => {
    expect(hopSamples(1024, 50)).toBe(512);
    expect(hopSamples(1024, 66.7)).toBe(341);
    expect(hopSamples(8, 95)).toBe(1);
    expect(hopSamples(1024, 0)).toBe(1024);
    expect([7, 8, 11, 12, 13].map((samples) => segmentsThatFit(samples, 8, 4))).toEqual([0, 1, 1, 2, 2]);
  });
});

describe('scaling', () => {
  test.each([8, 256])(
    'the density of one rectangular segment of %i samples sums to its variance (Parseval)',
    (n) => {
      const samples = gaussianNoise(seededRandom(9), n).map((x) => x + 5);
      const mean = samples.reduce((sum, x) => sum + x, 0) / n;
      const variance = samples.reduce((sum, x) => sum + (x - mean) ** 2, 0) / n;
      const settings = {
        window: 'rectangular',
        segmentSamples: n,
        overlapPercent: 0,
        sampleRateHz: 51.2,
      } as const;
      const { density, lineSpacingHz } = averageDensity(samples, settings);
      const sum = density.reduce((total, value) => total + value * lineSpacingHz, 0);
      expect(Math.abs(sum / variance - 1)).toBeLessThan(1e-13);
    },
  );

  // (A²/2) / (noise bandwidth x line spacing) for A = 2, spacing 1 Hz.
  test.each([
    ['rectangular', 2],
    ['hann', 1.333333],
    ['hamming', 1.467539],
    ['flat-top', 0.530469],
  ] as const)('a tone of amplitude 2 on a line reads %s %f in the density', (window, height) => {
    const samples = Float64Array.from(
      { length: 3072 },
      (_, n) => 2 * Math.cos((2 * Math.PI * 100 * n) / 1024 + 0.3),
    );
    const settings = { window, segmentSamples: 1024, overlapPercent: 50, sampleRateHz: 1024 };
    const { density } = averageDensity(samples, settings);
    expect(density[100]).toBeCloseTo(height, 6);
  });

  test('the level does not depend on the sample rate, the density falls with it', () => {
    const samples = gaussianNoise(seededRandom(3), 200);
    const slow = averageDensity(samples, { ...hann8, sampleRateHz: 10 });
    const fast = averageDensity(samples, { ...hann8, sampleRateHz: 40 });
    slow.density.forEach((value, k) => {
      expect(fast.density[k]).toBeCloseTo(value / 4, 14);
    });
  });

  test('a steady offset changes nothing', () => {
    const samples = gaussianNoise(seededRandom(4), 200);
    const plain = averageDensity(samples, hann8);
    const raised = averageDensity(
      samples.map((x) => x + 1000),
      hann8,
    );
    plain.density.forEach((value, k) => {
      expect(Math.abs(raised.density[k] - value)).toBeLessThan(1e-11);
    });
  });
});

describe('broken promises', () => {
  test.each([
    [{ segmentSamples: 100 }, 'segmentSamples = 100: must be a power of two, at least 8'],
    [{ segmentSamples: 4 }, 'segmentSamples = 4: must be a power of two, at least 8'],
    [{ overlapPercent: 96 }, 'overlapPercent = 96: must lie between 0 and 95'],
    [{ overlapPercent: -1 }, 'overlapPercent = -1: must lie between 0 and 95'],
    [{ overlapPercent: Number.NaN }, 'overlapPercent = NaN: must lie between 0 and 95'],
    [{ sampleRateHz: 0 }, 'sampleRateHz = 0: must be positive'],
    [{ sampleRateHz: Number.POSITIVE_INFINITY }, 'sampleRateHz = Infinity: must be positive'],
  ])('%o is refused', (wrong, message) => {
    expect(() => new Averager({ ...hann8, ...wrong })).toThrow(message);
  });

  test('an average ends once', () => {
    const averager = new Averager(hann8);
    averager.finish();
    expect(() => averager.add(new Float64Array(1))).toThrow('finished');
    expect(() => averager.finish()).toThrow('only once');
  });
});
