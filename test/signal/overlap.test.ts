import { describe, expect, test } from 'vitest';
import { averageDensity } from '../../src/signal/averaging.ts';
import { effectiveAverages, windowCorrelations } from '../../src/signal/overlap.ts';
import { type WindowName, windowNames } from '../../src/signal/window.ts';
import { gaussianNoise, seededRandom } from './random.ts';

describe('correlation of neighbouring segments', () => {
  // Harris 1978, Table I, overlap correlation in percent at 75 and 50 % (quoted from memory); for Hamming at 50 % it
  // prints 23.5, recomputed 23.4.
  test.each([
    ['rectangular', 75.0, 50.0],
    ['hann', 65.9, 16.7],
    ['hamming', 70.7, 23.4],
    ['blackman', 56.7, 9.0],
    ['blackman-harris', 46.0, 3.8],
  ] as const)('%s agrees with Harris 1978', (name, at75, at50) => {
    expect(100 * windowCorrelations(name, 4096, 1024)[1]).toBeCloseTo(at75, 1);
    expect(100 * windowCorrelations(name, 4096, 2048)[1]).toBeCloseTo(at50, 1);
  });

  // Recomputed with numpy, five digits.
  test.each([
    ['hann', 3000, 1500, [1, 0.16667]],
    ['hann', 3000, 1000, [1, 0.47117, 0.02883]],
    ['hann', 4096, 1024, [1, 0.65915, 0.16667, 0.00751]],
    ['hamming', 4096, 1024, [1, 0.70692, 0.23377, 0.02685]],
    ['blackman-harris', 4096, 1024, [1, 0.45999, 0.0376, 0.00024]],
    ['rectangular', 4096, 1024, [1, 0.75, 0.5, 0.25]],
    ['flat-top', 4096, 2048, [1, -0.0153]],
    ['hann', 4096, 4096, [1]],
  ] as const)('%s, %i samples every %i', (name, length, hop, expected) => {
    const correlations = windowCorrelations(name, length, hop);
    expect(correlations).toHaveLength(expected.length);
    expected.forEach((value, m) => {
      expect(Math.abs(correlations[m] - value)).toBeLessThan(6e-6 + (name === 'flat-top' ? 4e-5 : 0));
    });
  });
});

describe('effective averages of a record of twenty segment lengths', () => {
  // Formula of Welch 1967, recomputed with numpy and confirmed by simulation; segments of 1200 samples.
  const table: [number, number, Partial<Record<WindowName, number>>][] = [
    [1200, 20, { hann: 20, hamming: 20, rectangular: 20, 'blackman-harris': 20 }],
    [900, 26, { hann: 25.997, hamming: 25.964, rectangular: 23.21, 'blackman-harris': 26 }],
    [600, 39, { hann: 36.997, hamming: 35.246, rectangular: 26.224, 'blackman-harris': 38.893 }],
    [400, 58, { hann: 40.335, hamming: 36.876, rectangular: 27.776, 'blackman-harris': 51.797 }],
    [300, 77, { hann: 40.274, hamming: 36.766, rectangular: 28.335, 'blackman-harris': 54.209 }],
    [120, 191, { hann: 40.011, hamming: 36.526, rectangular: 28.88, 'blackman-harris': 54.009 }],
    [60, 381, { hann: 39.912, hamming: 36.439, rectangular: 28.917, 'blackman-harris': 53.879 }],
  ];
  test.each(table)('a segment every %i samples, %i averages', (hop, averages, expected) => {
    for (const [name, value] of Object.entries(expected)) {
      expect(effectiveAverages(name as WindowName, 1200, hop, averages)).toBeCloseTo(value, 3);
    }
  });

  test('long records tend to 4/3 (rectangular) and 36/19 (Hann) a segment length at 50 % overlap', () => {
    const averages = 1e6;
    expect((2 * effectiveAverages('rectangular', 64, 32, averages)) / averages).toBeCloseTo(4 / 3, 5);
    expect((2 * effectiveAverages('hann', 64, 32, averages)) / averages).toBeCloseTo(36 / 19, 5);
  });

  test('one average is worth one', () => {
    for (const name of windowNames) expect(effectiveAverages(name, 64, 4, 1)).toBe(1);
  });

  test('they are what the spread of lines on simulated noise says', () => {
    const random = seededRandom(11);
    const settings = { window: 'hann', segmentSamples: 256, overlapPercent: 75, sampleRateHz: 256 } as const;
    const averages = 12;
    let sum = 0;
    let squares = 0;
    let count = 0;
    for (let record = 0; record < 300; record++) {
      const { density } = averageDensity(gaussianNoise(random, 256 + (averages - 1) * 64), settings);
      for (let k = 4; k < 124; k++) {
        sum += density[k];
        squares += density[k] ** 2;
        count++;
      }
    }
    const mean = sum / count;
    const simulated = mean ** 2 / (squares / count - mean ** 2);
    expect(Math.abs(simulated / effectiveAverages('hann', 256, 64, averages) - 1)).toBeLessThan(0.03);
  });
});
