import { describe, expect, test } from 'vitest';
import { averageDensity } from '../../src/signal/averaging.ts';
import { bandInterval, makeIntervalKernel } from '../../src/signal/band-interval.ts';
import { type BandWeights, bandLevel } from '../../src/signal/band-level.ts';
import { effectiveAverages } from '../../src/signal/overlap.ts';
import { makeWindow, type WindowName, windowNames } from '../../src/signal/window.ts';
import { intervalCoverage } from './coverage.ts';
import { gaussianNoise, seededRandom } from './random.ts';

function wholeLines(firstLine: number, lines: number): BandWeights {
  return { firstLine, weights: new Float64Array(lines).fill(1) };
}

/** c(d) by its definition: the plain Fourier sum of each product of the window with itself. */
function plainCoupling(name: WindowName, length: number, hop: number, averages: number, distance: number) {
  const w = makeWindow(name, length);
  const power = w.reduce((sum, value) => sum + value ** 2, 0);
  let total = 0;
  for (let m = 0; m < averages && m * hop < length; m++) {
    let real = 0;
    let imaginary = 0;
    for (let n = m * hop; n < length; n++) {
      real += w[n] * w[n - m * hop] * Math.cos((2 * Math.PI * distance * n) / length);
      imaginary += w[n] * w[n - m * hop] * Math.sin((2 * Math.PI * distance * n) / length);
    }
    total += ((m === 0 ? 1 : 2 * (1 - m / averages)) * (real ** 2 + imaginary ** 2)) / power ** 2;
  }
  return total;
}

describe('how lines and segments repeat each other', () => {
  test('one Hann segment, worked by hand: 1, 4/9, 1/36 and nothing beyond', () => {
    const { lineCoupling } = makeIntervalKernel('hann', 64, 64, 1);
    expect(lineCoupling).toHaveLength(3);
    // c / (1 + c), at K = 1.
    [1 / 2, 4 / 13, 1 / 37].forEach((value, d) => {
      expect(lineCoupling[d]).toBeCloseTo(value, 14);
    });
  });

  test.each(windowNames)('%s: every distance as by definition', (name) => {
    for (const [hop, averages] of [
      [128, 3],
      [64, 2],
      [32, 7],
      [13, 30],
    ]) {
      const { lineCoupling } = makeIntervalKernel(name, 128, hop, averages);
      lineCoupling.forEach((value, d) => {
        const c = plainCoupling(name, 128, hop, averages, d);
        expect(value).toBeCloseTo(c / (1 + c / averages) / averages, 13);
      });
    }
  });

  test.each(windowNames)('%s: a single line is worth twice the effective averages', (name) => {
    for (const overlap of [0.5, 0.25, 0.1]) {
      const hop = Math.round(512 * overlap);
      const kernel = makeIntervalKernel(name, 512, hop, 31);
      const { degreesOfFreedom } = bandInterval(new Float64Array(257).fill(3), wholeLines(100, 1), kernel);
      expect(degreesOfFreedom).toBeCloseTo(2 * effectiveAverages(name, 512, hop, 31), 6);
    }
  });

  test('long segments are stood for by shorter ones without a difference that counts', () => {
    for (const name of windowNames) {
      const short = makeIntervalKernel(name, 8192, 8192 / 4, 20);
      const long = makeIntervalKernel(name, 65536, 65536 / 4, 20);
      const odd = makeIntervalKernel(name, 65536, 65536 / 4 + 3, 20);
      expect(long).toEqual(short);
      expect(odd.lineCoupling[0] / long.lineCoupling[0]).toBeCloseTo(1, 3);
      expect(odd.toneCoupling / long.toneCoupling).toBeCloseTo(1, 3);
    }
  });

  test('pooled recordings count as so many times the averages of one', () => {
    const one = makeIntervalKernel('hann', 256, 128, 9);
    const pooled = makeIntervalKernel('hann', 256, 128, [9, 9, 9, 9]);
    expect(pooled.averages).toBe(36);
    expect(pooled.toneCoupling).toBeCloseTo(one.toneCoupling / 4, 14);
    const density = new Float64Array(129).fill(1);
    const dof = (kernel: typeof one) => bandInterval(density, wholeLines(20, 1), kernel).degreesOfFreedom;
    expect(dof(pooled)).toBeCloseTo(4 * dof(one), 6);
  });

  test('pooled recordings of unequal length: the sum over all pairs of segments, as by definition', () => {
    const parts = [1, 4, 2];
    const hop = 32;
    const { lineCoupling, averages } = makeIntervalKernel('hann', 128, hop, parts);
    expect(averages).toBe(7);
    lineCoupling.forEach((value, d) => {
      // The variances of sums of K segments, K c each, add up over independent recordings.
      const c = parts.reduce((sum, part) => sum + part * plainCoupling('hann', 128, hop, part, d), 0) / 7;
      expect(value).toBeCloseTo(c / (1 + c / 7) / 7, 13);
    });
  });

  test('without an average there is no interval', () => {
    expect(() => makeIntervalKernel('hann', 256, 128, 0)).toThrow('averages = 0');
    expect(() => makeIntervalKernel('hann', 256, 128, [])).toThrow('averages');
    expect(() => makeIntervalKernel('hann', 100, 50, 1)).toThrow('length = 100');
  });
});

describe('the interval', () => {
  const flat = new Float64Array(257).fill(2);

  test('worked by hand: one line of one segment has 2 degrees of freedom, factors 0.2711 and 39.498 in power', () => {
    const kernel = makeIntervalKernel('hann', 512, 512, 1);
    const interval = bandInterval(flat, wholeLines(40, 1), kernel);
    expect(interval.degreesOfFreedom).toBeCloseTo(2, 12);
    expect(interval.level).toBe(Math.SQRT2);
    expect(interval.low ** 2 / 2).toBeCloseTo(0.2711, 4);
    expect(interval.high ** 2 / 2).toBeCloseTo(39.4979, 4);
  });

  test('Hann, 50 %, K = 39: 73.995 degrees of freedom and [0.7424, 1.4203] in power', () => {
    const kernel = makeIntervalKernel('hann', 512, 256, 39);
    const interval = bandInterval(flat, wholeLines(40, 1), kernel);
    expect(interval.degreesOfFreedom).toBeCloseTo(73.995, 3);
    expect(interval.low ** 2 / 2).toBeCloseTo(0.7424, 4);
    expect(interval.high ** 2 / 2).toBeCloseTo(1.4203, 4);
  });

  test('a wide band: relative spread of the level near 1 / (2 sqrt(B T)) (Bendat & Piersol)', () => {
    // 100 lines of 1 Hz over 2 s (K = 3 at 50 %): 3.54 % and a little more, 3.7 %, for what the overlap loses.
    const kernel = makeIntervalKernel('hann', 512, 256, 3);
    const { degreesOfFreedom } = bandInterval(flat, wholeLines(40, 100), kernel);
    const spread = Math.sqrt(2 / degreesOfFreedom) / 2;
    expect(spread).toBeGreaterThan(0.0354);
    expect(spread).toBeLessThan(0.0385);
  });

  test('the level is the band level and lies inside; more confidence is wider', () => {
    const density = gaussianNoise(seededRandom(1), 257).map((x) => x * x);
    const kernel = makeIntervalKernel('hann', 512, 256, 5);
    const band = wholeLines(10, 30);
    const usual = bandInterval(density, band, kernel);
    const surer = bandInterval(density, band, kernel, [], 99);
    expect(usual.confidencePercent).toBe(95);
    expect(usual.level).toBeCloseTo(bandLevel(density, band), 14);
    const edges = [surer.low, usual.low, usual.level, usual.high, surer.high];
    expect(edges).toEqual([...edges].sort((a, b) => a - b));
  });

  test('does not depend on the unit', () => {
    const density = gaussianNoise(seededRandom(2), 257).map((x) => x * x);
    const kernel = makeIntervalKernel('hann', 512, 256, 5);
    const tone = { firstLine: 12, lastLine: 16, floorDensity: 0.1 };
    const metres = bandInterval(density, wholeLines(10, 30), kernel, [tone]);
    const tiny = bandInterval(
      density.map((g) => g * 1e-24),
      wholeLines(10, 30),
      kernel,
      [{ ...tone, floorDensity: 1e-25 }],
    );
    expect(tiny.high / metres.high).toBeCloseTo(1e-12, 24);
    expect(tiny.low / metres.low).toBeCloseTo(1e-12, 24);
  });

  test('no power has no spread; an average of nothing has no interval', () => {
    const kernel = makeIntervalKernel('hann', 512, 256, 5);
    expect(bandInterval(new Float64Array(257), wholeLines(10, 5), kernel)).toMatchObject({
      level: 0,
      low: 0,
      high: 0,
    });
    const nothing = bandInterval(new Float64Array(257).fill(Number.NaN), wholeLines(10, 5), kernel);
    expect([nothing.level, nothing.low, nothing.high]).toEqual([Number.NaN, Number.NaN, Number.NaN]);
  });
});

describe('a tone in the band', () => {
  const samples = gaussianNoise(seededRandom(4), 512 * 16).map(
    (x, n) => 0.05 * x + Math.sin((2 * Math.PI * 50.3 * n) / 512),
  );
  const settings = { window: 'hann', segmentSamples: 512, overlapPercent: 50, sampleRateHz: 512 } as const;
  const { density, averages } = averageDensity(samples, settings);
  const kernel = makeIntervalKernel('hann', 512, 256, averages);
  const floorDensity = 0.05 ** 2 / 256;
  const tone = { firstLine: 48, lastLine: 52, floorDensity };

  test('is known far better than noise of the same power', () => {
    const asNoise = bandInterval(density, wholeLines(20, 100), kernel);
    const asTone = bandInterval(density, wholeLines(20, 100), kernel, [tone]);
    expect(asTone.level).toBe(asNoise.level);
    expect(asNoise.high / asNoise.low).toBeGreaterThan(1.3);
    expect(asTone.high / asTone.low).toBeLessThan(1.02);
    expect(asTone.low).toBeLessThan(Math.sqrt(0.5 + 100 * floorDensity));
    expect(asTone.high).toBeGreaterThan(Math.sqrt(0.5 + 100 * floorDensity));
  });

  test('counts once, in whatever order and however often its lines are named; outside the band not at all', () => {
    const other = { firstLine: 50, lastLine: 60, floorDensity };
    const band = wholeLines(20, 100);
    const once = bandInterval(density, band, kernel, [tone]);
    expect(bandInterval(density, band, kernel, [tone, tone])).toEqual(once);
    const both = bandInterval(density, band, kernel, [tone, other]);
    expect(bandInterval(density, band, kernel, [other, tone]).high).toBeCloseTo(both.high, 12);
    const aside = wholeLines(100, 20);
    expect(bandInterval(density, aside, kernel, [tone])).toEqual(bandInterval(density, aside, kernel));
  });
});

describe('coverage of the 95 % interval, short seeded form', () => {
  const within = (coverage: number[]) => {
    for (const percent of coverage) {
      expect(percent).toBeGreaterThanOrEqual(92.5);
      expect(percent).toBeLessThanOrEqual(97.5);
    }
  };
  const bandLines = [3, 5, 10, 30, 60, 180];

  test.each([
    ['hann', 1, 50],
    ['hann', 2, 75],
    ['hann', 5, 50],
    ['hann', 31, 50],
    ['rectangular', 5, 25],
    ['flat-top', 2, 50],
  ] as const)('noise: %s, %i averages, %i %% overlap', (window, averages, overlapPercent) => {
    within(intervalCoverage({ window, averages, overlapPercent, bandLines, recordings: 1000, seed: 41 }));
  });

  test('noise as velocity and as displacement, where the lowest lines weigh most', () => {
    const cases = { window: 'hann', averages: 5, overlapPercent: 50, bandLines, recordings: 1000 } as const;
    within(intervalCoverage({ ...cases, integrations: 1, seed: 42 }));
    within(intervalCoverage({ ...cases, integrations: 2, seed: 43 }));
  });

  test.each([
    ['hann', 1, 50, 25],
    ['hann', 5, 75, 40],
    ['flat-top', 5, 50, 25],
  ] as const)(
    'a steady tone in noise: %s, %i averages, %i %%, %i dB',
    (window, averages, overlapPercent, db) => {
      const tone = { fromLine: 50, toLine: 70, dbOverFloorLine: db };
      const cases = { window, averages, overlapPercent, firstLine: 40, tone, recordings: 1000, seed: 44 };
      within(intervalCoverage({ ...cases, bandLines: [40, 150] }));
    },
  );

  test.each([
    ['thirty bursts of one segment', new Array(30).fill(1), 50],
    [
      'thirty bursts of one segment and a bit, unequal',
      Array.from({ length: 30 }, (_, i) => 1 + (i % 3)),
      75,
    ],
    ['three recordings', [5, 5, 5], 50],
  ])('noise, pooled: %s', (_, averages, overlapPercent) => {
    const recordings = 1000;
    within(intervalCoverage({ window: 'hann', averages, overlapPercent, bandLines, recordings, seed: 45 }));
  });
});
