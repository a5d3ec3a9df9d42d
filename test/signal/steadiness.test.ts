import { describe, expect, it } from 'vitest';
import { floorSpreadLimit, levelVariance } from '../../src/signal/floor-spread.ts';
import { SegmentSpectra } from '../../src/signal/segment-spectra.ts';
import { windowNames } from '../../src/signal/window.ts';
import { type Colour, colouredNoise } from './coloured-noise.ts';
import { addTone, samplesOf, type Trial } from './peak-trials.ts';
import { seededRandom } from './random.ts';
import { judge } from './steadiness-trials.ts';

const seed = 20261201;
const segmentSamples = 1024;
const averagesJudged = [4, 9, 31, 300];

describe('segment densities', () => {
  it('are kept one by one up to the capacity, then averaged in pairs, in order of time', () => {
    const segments = new SegmentSpectra(2, 8);
    const seen: [number, number][] = [];
    for (let k = 0; k < 20; k++) {
      segments.add(Float64Array.of(k, 2 * k));
      seen.push([segments.count, segments.segmentsPerGroup]);
    }
    expect(seen.slice(6, 10)).toEqual([
      [7, 1],
      [4, 2],
      [4, 2],
      [5, 2],
    ]);
    expect(seen[19]).toEqual([5, 4]);
    expect(Array.from({ length: 5 }, (_, g) => Array.from(segments.group(g)))).toEqual(
      [1.5, 5.5, 9.5, 13.5, 17.5].map((mean) => [mean, 2 * mean]),
    );
  });
});

describe('the 99.9 % point of the floor spread', () => {
  it('of independent segments is that of chi-square over its degrees of freedom', () => {
    const shape = {
      window: 'hann',
      segmentSamples,
      hopSamples: segmentSamples,
      segmentsPerGroup: 1,
    } as const;
    expect(floorSpreadLimit({ ...shape, groups: 5 })).toBeCloseTo(18.46683 / 4, 4);
    expect(floorSpreadLimit({ ...shape, groups: 31 })).toBeCloseTo(59.70306 / 30, 4);
    expect(floorSpreadLimit({ ...shape, groups: 31, segmentsPerGroup: 4 })).toBeCloseTo(59.70306 / 120, 5);
  });

  it('for all lines of a long spectrum the variance is N sum w⁴ / (sum w²)² over the lines', () => {
    const marked = new Uint8Array(8193).fill(1);
    expect(levelVariance('hann', 16384, marked) * 8193).toBeCloseTo(35 / 18, 3);
    expect(levelVariance('rectangular', 16384, marked) * 8193).toBeCloseTo(1, 9);
  });
});

describe('steadiness', () => {
  const cases = windowNames.flatMap((window) =>
    averagesJudged.map((averages) => [window, averages] as const),
  );

  const judged = (
    trial: Trial,
    level: (share: number) => number,
    angle: (n: number, share: number) => number,
  ) => {
    const samples = colouredNoise('white', seededRandom(seed), samplesOf(trial)).map((value) => 0.1 * value);
    for (let n = 0; n < samples.length; n++) {
      samples[n] += level(n / samples.length) * Math.sin(angle(n, n / samples.length));
    }
    return judge(samples, trial);
  };
  const turn = (2 * Math.PI) / segmentSamples;

  it.each(cases)('%s, %i averages: a steady tone in steady noise is steady', (window, averages) => {
    const found = judged(
      { window, segmentSamples, overlapPercent: 50, averages },
      () => 1,
      (n) => turn * 40.3 * n,
    );
    expect(found?.unsteady).toBe(false);
    expect(found?.detail).toBe('');
    expect(found?.peakSpreadRatio).toBeLessThan(0.2);
  });

  it.each(cases)(
    '%s, %i averages: a tone that doubles within the recording is flagged',
    (window, averages) => {
      const trial = { window, segmentSamples, overlapPercent: 50, averages };
      const found = judged(
        trial,
        (share) => 1 + share,
        (n) => turn * 40.3 * n,
      );
      expect(found?.unsteady).toBe(true);
      expect(found?.peakSpreadRatio).toBeGreaterThan(1);
      expect(found?.segmentSpread).toBe(Math.max(found?.peakSpreadRatio ?? 0, found?.floorSpreadRatio ?? 0));
      expect(found?.detail).toMatch(
        /^.*the level of the peak at 0.03\d+ Hz moves by ±\d+ %, more than ±10 %/,
      );
    },
  );

  it.each(cases)('%s, %i averages: a frequency that sweeps two lines is flagged', (window, averages) => {
    const trial = { window, segmentSamples, overlapPercent: 50, averages };
    const found = judged(
      trial,
      () => 1,
      (n, share) => turn * (40.3 + share) * n,
    );
    expect(found?.peakSpreadRatio).toBeGreaterThan(1);
    expect(found?.unsteady).toBe(true);
    expect(found?.detail).toMatch(
      /the frequency of the peak at .* moves by ±[\d.]+ lines, more than ±0.5 lines$/,
    );
  });

  it.each(cases)('%s, %i averages: broadband noise that doubles is flagged', (window, averages) => {
    const trial = { window, segmentSamples, overlapPercent: 50, averages };
    const noise = colouredNoise('white', seededRandom(seed), samplesOf(trial));
    const found = judge(
      noise.map((value, n) => value * (1 + n / noise.length)),
      trial,
    );
    expect(found?.floorSpreadRatio).toBeGreaterThan(1);
    expect(found?.unsteady).toBe(true);
    expect(found?.detail).toContain('the noise floor varies');
  });

  it('a steady hump of noise is not taken for an unsteady tone', () => {
    const trial = { window: 'hann', segmentSamples: 2048, overlapPercent: 50, averages: 63 } as const;
    const random = seededRandom(seed);
    let before = 0;
    let earlier = 0;
    const radius = 0.985;
    const samples = Float64Array.from({ length: samplesOf(trial) + 500 }, () => {
      const value = 2 * radius * Math.cos(1.2) * before - radius ** 2 * earlier + random.gaussian();
      earlier = before;
      before = value;
      return value + 3 * random.gaussian();
    }).subarray(500);
    const found = judge(samples, trial);
    expect(found?.peakSpreadRatio).toBeNull();
    expect(found?.unsteady).toBe(false);
  });

  it('below four averages nothing is said', () => {
    const trial = { window: 'hann', segmentSamples, overlapPercent: 50, averages: 3 } as const;
    expect(judge(colouredNoise('white', seededRandom(seed), samplesOf(trial)), trial)).toBeNull();
  });

  it('of 1,200 steady recordings, a steady tone in every second, at most four are flagged (seed 20261201)', () => {
    const random = seededRandom(seed);
    const colours: Colour[] = ['white', 'pink'];
    let flagged = 0;
    for (let t = 0; t < 1200; t++) {
      const [averages, overlapPercent] = [
        [4, 0],
        [9, 75],
        [31, 50],
      ][t % 3];
      const trial: Trial = { window: windowNames[t % 6], segmentSamples: 512, overlapPercent, averages };
      const samples = colouredNoise(colours[Math.floor(t / 3) % 2], random, samplesOf(trial));
      if (Math.floor(t / 2) % 2 === 0)
        addTone(samples, trial, 40 + 150 * random.uniform(), 0.5 + 3 * random.uniform(), 1);
      if (judge(samples, trial)?.unsteady) flagged++;
    }
    expect(flagged).toBeLessThanOrEqual(4);
  });
});
