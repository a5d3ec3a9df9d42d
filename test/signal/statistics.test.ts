import { readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import {
  chiSquareQuantile,
  gaussianQuantile,
  madToDeviation,
  median,
  medianAbsoluteDeviation,
  quantile,
} from '../../src/signal/statistics.ts';
import { gaussianNoise, seededRandom } from './random.ts';

describe('order statistics', () => {
  test('the median of odd and even counts, and of nothing', () => {
    expect(median([3, 1, 2])).toBe(2);
    expect(median([4, 1, 3, 2])).toBe(2.5);
    expect(median([7])).toBe(7);
    expect(median([])).toBeNaN();
  });

  test('numbers are ordered as numbers, and the values keep their order', () => {
    const values = [10, 9, 100, -1];
    expect(median(values)).toBe(9.5);
    expect(values).toEqual([10, 9, 100, -1]);
  });

  test('quantiles are linear between ranks', () => {
    expect(quantile([1, 2, 3, 4], 0.25)).toBe(1.75);
    expect(quantile([1, 2, 3, 4], 0)).toBe(1);
    expect(quantile([1, 2, 3, 4], 1)).toBe(4);
    expect(quantile(Float64Array.of(5, 1), 0.9)).toBeCloseTo(4.6, 12);
  });

  test('a NaN among the values shows', () => {
    expect(quantile([1, Number.NaN, 3], 0.1)).toBeNaN();
  });

  test('the median absolute deviation, and the standard deviation it estimates', () => {
    expect(medianAbsoluteDeviation([1, 1, 2, 2, 4, 6, 9])).toBe(1);
    const noise = gaussianNoise(seededRandom(2), 40_000, 3);
    expect(madToDeviation * medianAbsoluteDeviation(noise)).toBeCloseTo(3, 1);
  });
});

describe('chi-square quantiles', () => {
  // Printed to four digits in any table of the distribution: degrees, 0.025, 0.975.
  test.each([
    [2, 0.0506, 7.3778],
    [4, 0.4844, 11.1433],
    [8, 2.1797, 17.5345],
    [20, 9.5908, 34.1696],
    [40, 24.433, 59.3417],
    [100, 74.2219, 129.5612],
    [200, 162.728, 241.0579],
  ])('%i degrees of freedom', (degrees, low, high) => {
    expect(chiSquareQuantile(0.025, degrees)).toBeCloseTo(low, 4);
    expect(chiSquareQuantile(0.975, degrees)).toBeCloseTo(high, 4);
  });

  test('agree with SciPy, whole and broken degrees of freedom, from 1 to a thousand million', () => {
    const path = new URL('../golden/chi-square.json', import.meta.url);
    const golden = JSON.parse(readFileSync(path, 'utf8'));
    for (const { degrees, shares, chi_square: expected } of golden.cases) {
      shares.forEach((share: number, i: number) => {
        const error = Math.abs(chiSquareQuantile(share, degrees) / expected[i] - 1);
        expect(error, `share ${share}, ${degrees} degrees`).toBeLessThan(degrees < 1000 ? 1e-13 : 3e-5);
      });
    }
    expect(golden.cases).toHaveLength(15);
  });

  test('Gaussian quantiles', () => {
    expect(gaussianQuantile(0.975)).toBeCloseTo(1.959963985, 9);
    expect(gaussianQuantile(0.025)).toBeCloseTo(-1.959963985, 9);
    expect(gaussianQuantile(0.5)).toBe(0);
    expect(gaussianQuantile(0.9986501)).toBeCloseTo(3, 4);
  });
});
