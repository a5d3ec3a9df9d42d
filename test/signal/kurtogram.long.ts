import { expect, test } from 'vitest';
import { bandsFound, noisePassing } from './kurtogram-trials.ts';

test.each([50, 75, 100])(
  'a band that rings 10 dB below the noise is found in 95 of 100 recordings at %i impacts a second',
  (impactsPerS) => {
    expect(bandsFound(impactsPerS, 100)).toBeGreaterThanOrEqual(95);
  },
);

test('above 100 impacts a second fewer are found: the rate reached', () => {
  const reached = [150, 200, 250, 300, 350, 400].map((rate) => `${rate}/s: ${bandsFound(rate, 50)} of 50`);
  console.info(reached.join(', '));
  expect(bandsFound(200, 50)).toBeGreaterThanOrEqual(45);
});

test('of 10,000 recordings of noise at most 20 have a band above its noise point: 10 are expected', () => {
  expect(noisePassing(10_000, 1, 77)).toBeLessThanOrEqual(20);
});
