import { describe, expect, it } from 'vitest';
import { averageDensity, hopSamples } from '../../src/signal/averaging.ts';
import { bandInterval, makeIntervalKernel } from '../../src/signal/band-interval.ts';
import { bandWeights } from '../../src/signal/band-level.ts';
import {
  bandUncertainty,
  degreesFor,
  lineUncertainty,
  uncertaintyOf,
} from '../../src/signal/level-uncertainty.ts';
import { effectiveAverages } from '../../src/signal/overlap.ts';
import { layOutSegments } from '../../src/signal/segment-length.ts';
import { median } from '../../src/signal/statistics.ts';
import { gaussianNoise, seededRandom } from './random.ts';

describe('how well a level is known', () => {
  // chi-square intervals as in any table of the distribution (Bendat & Piersol, Random Data, table A.3): factors and dB.
  it.each([
    [2, 0.2711, 39.4979, -5.67, 15.97],
    [4, 0.359, 8.2573, -4.45, 9.17],
    [10, 0.4882, 3.0798, -3.11, 4.89],
    [20, 0.5853, 2.0853, -2.33, 3.19],
    [40, 0.6741, 1.6371, -1.71, 2.14],
    [80, 0.7503, 1.3997, -1.25, 1.46],
    [200, 0.8297, 1.229, -0.81, 0.9],
  ])(
    '%i degrees of freedom: factors %f to %f, %f to %f dB at 95 percent',
    (degrees, low, high, lowDb, highDb) => {
      const known = uncertaintyOf(degrees, 95);
      expect(10 ** (known.lowDb / 10)).toBeCloseTo(low, 4);
      expect(10 ** (known.highDb / 10) / high).toBeCloseTo(1, 4);
      expect(known.lowDb).toBeCloseTo(lowDb, 2);
      expect(known.highDb).toBeCloseTo(highDb, 2);
    },
  );

  it('is stated at other confidences too: 90 % of 20 degrees 0.6368 to 1.8432', () => {
    const known = uncertaintyOf(20, 90);
    expect(10 ** (known.lowDb / 10)).toBeCloseTo(0.6368, 3);
    expect(10 ** (known.highDb / 10)).toBeCloseTo(1.8432, 3);
  });

  it('of a line from 39 half overlapped averages is -1.29 and +1.52 dB', () => {
    // Welch 1967 with rho_1 = 1/6 for Hann: K_eff = 39 / (1 + 2 (38/39) / 36) = 36.9973; factors 0.7424 and 1.4203.
    const known = lineUncertainty(effectiveAverages('hann', 1200, 600, 39), 95);
    expect(known.degreesOfFreedom).toBeCloseTo(73.995, 2);
    expect(known.lowDb).toBeCloseTo(-1.29, 2);
    expect(known.highDb).toBeCloseTo(1.52, 2);
  });

  it('gives back the degrees of freedom that a width needs', () => {
    expect(degreesFor(10 * Math.log10(1.6371), 95)).toBeCloseTo(40, 1);
    for (const db of [0.05, 0.3, 1, 3, 9]) {
      const degrees = degreesFor(db, 95);
      expect(uncertaintyOf(degrees, 95).highDb).toBeLessThanOrEqual(db);
      expect(uncertaintyOf(0.999 * degrees, 95).highDb).toBeGreaterThan(db);
    }
  });
});

describe('how well a band of noise is known', () => {
  const of = (bandwidthHz: number, durationS: number, segmentSamples: number, overlapPercent = 50) => {
    const sampleRateHz = 2048;
    const layout = layOutSegments({
      window: 'hann',
      segmentSamples,
      overlapPercent,
      skipStartS: 0,
      sampleRateHz,
      durationS,
    });
    const { lineSpacingHz, hopSamples: hop, averages } = layout;
    const band = bandWeights(200, 200 + bandwidthHz, { lineSpacingHz, lines: segmentSamples / 2 + 1 });
    if ('refused' in band) throw new Error(band.reason);
    const kernel = makeIntervalKernel('hann', segmentSamples, hop, averages);
    return { known: bandUncertainty(band.weights, kernel, 95), layout };
  };

  it('follows bandwidth times length: 100 Hz for 2 s deviate by 7.3 % where 1 / sqrt(BT) is 7.07 %', () => {
    // Bendat & Piersol, Random Data: normalised random error of a mean square 1 / sqrt(BT); the excess is the overlap's loss.
    const deviation = Math.sqrt(2 / of(100, 2, 512).known.degreesOfFreedom);
    expect(deviation).toBeGreaterThan(1 / Math.sqrt(100 * 2));
    expect(deviation / 0.073).toBeGreaterThan(0.98);
    expect(deviation / 0.073).toBeLessThan(1.02);
  });

  it('narrows with bandwidth and length alike, whatever the segment', () => {
    const [once, wide, long] = [of(50, 4, 512), of(200, 4, 512), of(50, 16, 512)].map(
      ({ known }) => known.degreesOfFreedom,
    ) as [number, number, number];
    expect(wide / once).toBeGreaterThan(3.5);
    expect(wide / once).toBeLessThan(4.2);
    expect(long / once).toBeGreaterThan(3.5);
    expect(long / once).toBeLessThan(4.4);
    expect(of(100, 8, 256).known.degreesOfFreedom / of(100, 8, 1024).known.degreesOfFreedom).toBeCloseTo(
      1,
      0,
    );
  });

  it('is on one line as Welch has it, twice the effective averages', () => {
    for (const averages of [1, 2, 5, 31]) {
      const kernel = makeIntervalKernel('hann', 1024, 512, averages);
      const known = bandUncertainty(Float64Array.of(1), kernel, 95);
      const expected = 2 * effectiveAverages('hann', 1024, 512, averages);
      expect(known.degreesOfFreedom / expected).toBeCloseTo(1, 3);
    }
  });

  it.each([
    [1, 0, 40],
    [5, 50, 12],
    [31, 50, 3],
    [15, 75, 60],
  ])(
    'is what the interval of a measured level comes to: %i averages, overlap %i percent, %i lines',
    (averages, overlapPercent, lines) => {
      const segmentSamples = 256;
      const hop = hopSamples(segmentSamples, overlapPercent);
      const random = seededRandom(20261201 + averages);
      const grid = { lineSpacingHz: 1, lines: 129 };
      const band = bandWeights(30, 30 + lines, grid);
      if ('refused' in band) throw new Error(band.reason);
      const kernel = makeIntervalKernel('hann', segmentSamples, hop, averages);
      const found: number[] = [];
      for (let n = 0; n < 200; n++) {
        const samples = gaussianNoise(random, segmentSamples + (averages - 1) * hop);
        const { density } = averageDensity(samples, {
          window: 'hann',
          segmentSamples,
          overlapPercent,
          sampleRateHz: segmentSamples,
        });
        const measured = bandInterval(density, band, kernel);
        found.push(20 * Math.log10(measured.high / measured.low));
      }
      const known = bandUncertainty(band.weights, kernel, 95);
      expect(median(found) / (known.highDb - known.lowDb)).toBeGreaterThan(0.93);
      expect(median(found) / (known.highDb - known.lowDb)).toBeLessThan(1.07);
    },
  );
});
