import { expect, test } from 'vitest';
import { gaussianNoise, seededRandom } from './random.ts';

test('the same seed gives the same numbers, another seed others', () => {
  const first = gaussianNoise(seededRandom(7), 50);
  expect(gaussianNoise(seededRandom(7), 50)).toEqual(first);
  expect(gaussianNoise(seededRandom(8), 50)).not.toEqual(first);
});

test('Gaussian numbers have the moments 0, 1, 0, 3 and no correlation from one to the next', () => {
  const n = 200_000;
  const x = gaussianNoise(seededRandom(1), n);
  const moment = (p: number) => x.reduce((sum, v) => sum + v ** p, 0) / n;
  // Five standard errors each: sqrt(1/n), sqrt(2/n), sqrt(15/n), sqrt(96/n).
  expect(Math.abs(moment(1))).toBeLessThan(5 * Math.sqrt(1 / n));
  expect(Math.abs(moment(2) - 1)).toBeLessThan(5 * Math.sqrt(2 / n));
  expect(Math.abs(moment(3))).toBeLessThan(5 * Math.sqrt(15 / n));
  expect(Math.abs(moment(4) - 3)).toBeLessThan(5 * Math.sqrt(96 / n));
  let neighbour = 0;
  for (let i = 1; i < n; i++) neighbour += x[i - 1] * x[i];
  expect(Math.abs(neighbour / n)).toBeLessThan(5 / Math.sqrt(n));
});

test('uniform numbers fill [0, 1) evenly', () => {
  const random = seededRandom(3);
  const counts = new Array<number>(100).fill(0);
  const n = 100_000;
  for (let i = 0; i < n; i++) counts[Math.floor(100 * random.uniform())]++;
  const chiSquare = counts.reduce((sum, c) => sum + (c - n / 100) ** 2 / (n / 100), 0);
  // 99 degrees of freedom: mean 99, standard deviation 14.
  expect(chiSquare).toBeGreaterThan(50);
  expect(chiSquare).toBeLessThan(160);
});
