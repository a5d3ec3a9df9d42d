import { readFileSync } from 'node:fs';
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { averageDensity } from '../../src/signal/averaging.ts';
import {
  type BandWeights,
  bandLevel,
  bandPower,
  bandWeights,
  type LineGrid,
} from '../../src/signal/band-level.ts';
import type { Integrations } from '../../src/signal/integration.ts';
import type { WindowName } from '../../src/signal/window.ts';
import { type GoldenInput, goldenSamples } from './golden-samples.ts';
import { gaussianNoise, seededRandom } from './random.ts';

/** The weights of a band that must not be refused. */
function weightsOf(fromHz: number, toHz: number, grid: LineGrid, integrations?: Integrations): BandWeights {
  const band = bandWeights(fromHz, toHz, grid, integrations);
  if ('refused' in band) throw new Error(band.reason);
  return band;
}

const oneHz: LineGrid = { lineSpacingHz: 1, lines: 101 };

describe('which part of a line counts, worked by hand', () => {
  test.each([
    ['whole cells', 9.5, 12.5, 10, [1, 1, 1]],
    ['half the outermost cells', 10, 12, 10, [0.5, 1, 0.5]],
    ['any part of a cell', 9.75, 11.25, 10, [0.75, 0.75]],
    ['inside one cell', 10.1, 10.3, 10, [0.2]],
    ['from 0 Hz: line 0 takes no part', 0, 2, 1, [1, 0.5]],
    ['to half the sample rate', 98, 100, 98, [0.5, 1, 0.5]],
  ])('%s', (_, from, to, firstLine, weights) => {
    const band = weightsOf(from, to, oneHz);
    expect(band.firstLine).toBe(firstLine);
    expect(band.weights).toHaveLength(weights.length);
    weights.forEach((weight, i) => {
      expect(band.weights[i]).toBeCloseTo(weight, 12);
    });
  });

  test('velocity and displacement over a cell of 10 to 10.5 Hz', () => {
    const two = 2 * Math.PI;
    const velocity = weightsOf(10, 10.5, oneHz, 1).weights[0];
    const displacement = weightsOf(10, 10.5, oneHz, 2).weights[0];
    expect(velocity / (0.5 / (two ** 2 * 105))).toBeCloseTo(1, 13);
    expect(displacement / ((10 ** -3 - 10.5 ** -3) / (3 * two ** 4))).toBeCloseTo(1, 11);
  });
});

test('neighbouring bands add up to the band of both, cut wherever one likes', () => {
  const edges = fc.tuple(
    fc.double({ min: 0.01, max: 100, noNaN: true }),
    fc.double({ min: 0.01, max: 100, noNaN: true }),
    fc.double({ min: 0.01, max: 100, noNaN: true }),
  );
  const density = gaussianNoise(seededRandom(1), 101).map((x) => x * x);
  fc.assert(
    fc.property(edges, fc.constantFrom<Integrations>(0, 1, 2), (unsorted, integrations) => {
      const [a, b, c] = [...unsorted].sort((x, y) => x - y);
      fc.pre(b > Math.max(a, 0.5) && c > b);
      const power = (from: number, to: number) =>
        bandPower(density, weightsOf(from, to, oneHz, integrations));
      expect((power(a, b) + power(b, c)) / power(a, c)).toBeCloseTo(1, 9);
    }),
    { seed: 20261201, numRuns: 300 },
  );
});

describe('refused with a reason', () => {
  test('a band beyond half the sample rate', () => {
    expect(bandWeights(10, 100.1, oneHz)).toEqual({
      refused: 'beyond-half-rate',
      reason: 'band ends at 100.1 Hz, the spectrum at 100 Hz; end the band there or record faster',
    });
    expect(bandWeights(10, Number.NaN, oneHz)).toMatchObject({ refused: 'beyond-half-rate' });
  });

  test('a band that holds nothing', () => {
    expect(bandWeights(0, 0.4, oneHz)).toEqual({
      refused: 'empty',
      reason: 'band from 0 to 0.4 Hz holds no line (spacing 1 Hz); widen it or use longer segments',
    });
    for (const [from, to] of [
      [10, 10],
      [20, 10],
      [Number.NaN, 10],
    ]) {
      expect(bandWeights(from, to, oneHz)).toMatchObject({ refused: 'empty' });
    }
  });
});

describe('levels', () => {
  test('three tones: only those inside the band count, as velocities', () => {
    // 10 m/s² at 50 Hz and 20 at 800 Hz make 22.68307 mm/s r.m.s.; 50 at 5 Hz would add 1125 mm/s.
    const samples = Float64Array.from({ length: 51200 }, (_, n) => {
      const t = (2 * Math.PI * n) / 5120;
      return 10 * Math.sin(50 * t) + 20 * Math.sin(800 * t + 1) + 50 * Math.sin(5 * t);
    });
    const settings = {
      window: 'hann',
      segmentSamples: 4096,
      overlapPercent: 50,
      sampleRateHz: 5120,
    } as const;
    const { density, lineSpacingHz } = averageDensity(samples, settings);
    const grid = { lineSpacingHz, lines: density.length };
    const velocity = 1000 * bandLevel(density, weightsOf(15, 1000, grid, 1));
    expect(Math.abs(velocity / 22.68307 - 1)).toBeLessThan(1e-3);
    expect(bandLevel(density, weightsOf(15, 1000, grid))).toBeCloseTo(Math.sqrt(250), 3);
  });

  test('agree with SciPy to 1e-9 in acceleration, velocity and displacement', () => {
    const golden = JSON.parse(
      readFileSync(new URL('../golden/band-level.json', import.meta.url), 'utf8'),
    ) as {
      samples: number;
      input: GoldenInput;
      cases: {
        window: WindowName;
        sample_rate_hz: number;
        segment_samples: number;
        overlap_percent: number;
        from_hz: number;
        to_hz: number;
        levels: number[];
      }[];
    };
    const samples = goldenSamples(golden.samples, golden.input);
    expect(golden.cases).toHaveLength(90);
    for (const entry of golden.cases) {
      const { density, lineSpacingHz } = averageDensity(samples, {
        window: entry.window,
        segmentSamples: entry.segment_samples,
        overlapPercent: entry.overlap_percent,
        sampleRateHz: entry.sample_rate_hz,
      });
      const grid = { lineSpacingHz, lines: density.length };
      for (const integrations of [0, 1, 2] as const) {
        const level = bandLevel(density, weightsOf(entry.from_hz, entry.to_hz, grid, integrations));
        expect(Math.abs(level / entry.levels[integrations] - 1)).toBeLessThan(1e-9);
      }
    }
  });
});
