import { describe, expect, test } from 'vitest';
import type { AveragedDensity } from '../../src/signal/averaging.ts';
import { averageDensity } from '../../src/signal/averaging.ts';
import { bandInterval, type IntervalKernel, makeIntervalKernel } from '../../src/signal/band-interval.ts';
import { bandPower, bandWeights } from '../../src/signal/band-level.ts';
import { envelopeOf } from '../../src/signal/demodulation.ts';
import {
  EnvelopeAverager,
  type EnvelopeSettings,
  envelopeAveraging,
  secondsForEnvelope,
} from '../../src/signal/envelope.ts';
import { findPeaks } from '../../src/signal/peaks.ts';
import { poolDensities } from '../../src/signal/pooled-density.ts';
import { hiddenImpacts } from './hidden-impacts.ts';
import { gaussianNoise, seededRandom } from './random.ts';

const sampleRateHz = 25_600;
const settings: EnvelopeSettings = {
  sampleRateHz,
  fromHz: 2000,
  toHz: 8000,
  highestHz: 400,
  window: 'hann',
  overlapPercent: 50,
  lineSpacingHz: 2,
};

function averaged(samples: Float64Array, changed: Partial<EnvelopeSettings> = {}): AveragedDensity {
  const averager = new EnvelopeAverager(envelopeAveraging({ ...settings, ...changed }));
  averager.add(samples);
  return averager.finish();
}

function peaksOf({ density, averages, hopSamples, lineSpacingHz }: AveragedDensity, perRecording?: number[]) {
  const segmentSamples = 2 * (density.length - 1);
  return findPeaks(density, {
    window: 'hann',
    segmentSamples,
    hopSamples,
    averages: perRecording ?? averages,
    sampleRateHz: segmentSamples * lineSpacingHz,
  }).peaks;
}

test('it is the average over the envelope, whatever lengths the transforms have', () => {
  const samples = gaussianNoise(seededRandom(3), 60_000);
  for (const lineSpacingHz of [100, 12.5, 2]) {
    const { averaging } = envelopeAveraging({ ...settings, lineSpacingHz });
    expect(averaging.sampleRateHz / averaging.segmentSamples).toBeLessThanOrEqual(lineSpacingHz);
    expect(averaged(samples, { lineSpacingHz })).toEqual(
      averageDensity(envelopeOf(samples, settings), averaging),
    );
  }
});

test('a tone modulated by m has one peak, at the modulation, of level m / sqrt 2', () => {
  const samples = Float64Array.from({ length: 256_000 }, (_, n) => {
    const t = (2 * Math.PI * n) / sampleRateHz;
    return 9.81 * (1 + 0.3 * Math.cos(88.3 * t)) * Math.cos(4000.7 * t) + 20 * Math.cos(49.5 * t);
  });
  const peaks = peaksOf(averaged(samples));
  expect(peaks[0].frequencyHz).toBeCloseTo(88.3, 3);
  expect(peaks[0].level / ((9.81 * 0.3) / Math.SQRT2)).toBeCloseTo(1, 4);
  for (const { level } of peaks.slice(1)) expect(level).toBeLessThan(1e-5 * peaks[0].level);
});

test('impacts in noise are seen at their rate and its multiples', () => {
  const samples = hiddenImpacts(seededRandom(4), {
    sampleRateHz,
    durationS: 10,
    impactsPerS: 100,
    resonanceHz: 4000,
    halfWidthHz: 150,
    aboveNoiseDb: -6,
    slip: 0.01,
  });
  const found = peaksOf(averaged(samples, { fromHz: 3000, toHz: 5000 }))
    .slice(0, 5)
    .map(({ frequencyHz }) => Math.round(frequencyHz))
    .sort((a, b) => a - b);
  expect(found).toEqual([100, 200, 300, 400, 500]);
});

describe('short bursts', () => {
  const burst = (seed: number) =>
    averaged(
      hiddenImpacts(seededRandom(seed), {
        sampleRateHz,
        durationS: 0.1,
        impactsPerS: 100,
        resonanceHz: 4200,
        halfWidthHz: 150,
        aboveNoiseDb: -6,
        slip: 0.01,
      }),
      { lineSpacingHz: 25 },
    );
  const isLine = ({ frequencyHz }: { frequencyHz: number }) => Math.abs(frequencyHz - 100) < 12.5;

  test('thirty of 0.1 s, pooled, give the line of impacts at -6 dB that one does not show', () => {
    let [alone, together] = [0, 0];
    for (let trial = 0; trial < 20; trial++) {
      const bursts = Array.from({ length: 30 }, (_, n) => burst(20261201 + 100 * trial + n));
      expect(bursts[0].averages).toBe(2);
      alone += bursts.filter((one) => peaksOf(one).some(isLine)).length;
      const pooled = poolDensities(bursts);
      expect(pooled.averages).toBe(60);
      if (
        peaksOf(
          pooled,
          bursts.map(({ averages }) => averages),
        ).some(isLine)
      )
        together++;
    }
    // Of 600 single bursts about 1 in 20 shows a peak there.
    expect(alone).toBeLessThan(60);
    expect(together).toBeGreaterThanOrEqual(17);
  });

  test('pooling weighs each by its segments and joins only what lies on the same lines', () => {
    const [a, b] = [burst(1), burst(2)];
    const pooled = poolDensities([a, { ...b, averages: 6 }]);
    expect(pooled.density[7]).toBeCloseTo((2 * a.density[7] + 6 * b.density[7]) / 8, 15);
    expect(() => poolDensities([a, averaged(new Float64Array(60_000))])).toThrow(RangeError);
    expect(() => poolDensities([])).toThrow(RangeError);
  });
});

test('the length of a recording that so many segments need is the shortest that gives them', () => {
  const made = envelopeAveraging(settings);
  for (const segments of [1, 2, 7]) {
    const samples = Math.ceil(secondsForEnvelope(made, segments) * sampleRateHz - 1e-6);
    expect(averaged(new Float64Array(samples).fill(1)).averages).toBe(segments);
    expect(averaged(new Float64Array(samples - 4).fill(1)).averages).toBe(segments - 1);
  }
});

test('the interval of an envelope level covers 95 % of recordings of noise', () => {
  const random = seededRandom(20261201);
  const trials = 600;
  const levels: { power: number; low: number; high: number }[] = [];
  let kernel: IntervalKernel | undefined;
  for (let trial = 0; trial < trials; trial++) {
    const result = averaged(gaussianNoise(random, 12_800), { lineSpacingHz: 25 });
    const { density, averages, hopSamples, lineSpacingHz } = result;
    const weights = bandWeights(75, 400, { lineSpacingHz, lines: density.length });
    if ('refused' in weights) throw new Error(weights.reason);
    kernel ??= makeIntervalKernel('hann', 2 * (density.length - 1), hopSamples, averages);
    const { low, high } = bandInterval(density, weights, kernel, []);
    levels.push({ power: bandPower(density, weights), low, high });
  }
  const level = Math.sqrt(levels.reduce((sum, { power }) => sum + power, 0) / trials);
  const covered = levels.filter(({ low, high }) => low <= level && level <= high).length / trials;
  expect(covered).toBeGreaterThan(0.925);
  expect(covered).toBeLessThan(0.975);
});
