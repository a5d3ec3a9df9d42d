import { readFileSync } from 'node:fs';
import { describe, expect, test } from 'vitest';
import { BandBlocks, BasebandBand } from '../../src/signal/band-blocks.ts';
import { bandLevel, bandWeights } from '../../src/signal/band-level.ts';
import { Demodulator, demodulationOf, envelopeOf, narrowestBandHz } from '../../src/signal/demodulation.ts';
import { EnvelopeAverager, envelopeAveraging } from '../../src/signal/envelope.ts';
import { waveformValues } from '../../src/signal/waveform.ts';
import { type GoldenInput, goldenSamples } from './golden-samples.ts';
import { gaussianNoise, seededRandom } from './random.ts';

const sampleRateHz = 25_600;
const band = { sampleRateHz, fromHz: 2000, toHz: 8000, highestHz: 400 };

/** (1 + m cos Ωt) cos ωt, with what does not belong to the band beside it. */
function modulated(depth: number, { slowHz = 87, carrierHz = 4321.3, beside = 0, count = 100_000 } = {}) {
  return Float64Array.from({ length: count }, (_, n) => {
    const t = (2 * Math.PI * n) / sampleRateHz;
    return (
      (1 + depth * Math.cos(slowHz * t)) * Math.cos(carrierHz * t + 1) +
      beside * (3 + 10 * Math.cos(50.3 * t) + 4 * Math.sin(9400 * t))
    );
  });
}

describe('the envelope of an amplitude-modulated tone', () => {
  test.each([
    ['by itself', 0, 1e-6],
    ['with a ten times stronger shaft line, an offset and a tone above the band beside it', 1, 3e-6],
  ])('is 1 + m cos Ωt, %s', (_, beside, within) => {
    const envelope = envelopeOf(modulated(0.5, { beside }), band);
    const { edgeSamples, decimation } = demodulationOf(band);
    expect(envelope.length).toBe(Math.ceil((100_000 - 2 * edgeSamples) / decimation));
    envelope.forEach((value, n) => {
      const t = (edgeSamples + n * decimation) / sampleRateHz;
      expect(Math.abs(value - 1 - 0.5 * Math.cos(2 * Math.PI * 87 * t))).toBeLessThan(within);
    });
  });

  test('has one line of amplitude m at Ω and nothing at 2 Ω; squared, 2 m and m² / 2', () => {
    // 1600 values of a rate of 6400 Hz are whole periods of 80 Hz.
    const envelope = envelopeOf(modulated(0.5, { slowHz: 80 }), band).subarray(0, 16_000);
    const amplitude = (values: Float64Array, hz: number) => {
      const step = (2 * Math.PI * hz) / 6400;
      const [re, im] = values.reduce(
        ([a, b], value, n) => [a + value * Math.cos(step * n), b + value * Math.sin(step * n)],
        [0, 0],
      );
      return (2 * Math.hypot(re, im)) / values.length;
    };
    expect(amplitude(envelope, 80)).toBeCloseTo(0.5, 9);
    expect(amplitude(envelope, 160)).toBeLessThan(1e-9);
    const squared = envelope.map((value) => value * value);
    expect(amplitude(squared, 80)).toBeCloseTo(1, 8);
    expect(amplitude(squared, 160)).toBeCloseTo(0.125, 8);
  });

  test.each([
    [0.25, 1.676997],
    [0.5, 2.101852],
    [1, 2.916667],
  ])(
    'with m = %f the tone itself has kurtosis %f, and (1 + m) / r.m.s. as its crest factor',
    (m, kurtosis) => {
      const count = 256_000;
      const values = waveformValues(modulated(m, { slowHz: 80, carrierHz: 4321, count }));
      expect(values.kurtosis).toBeCloseTo(kurtosis, 5);
      expect(values.rms).toBeCloseTo(Math.sqrt((1 + m ** 2 / 2) / 2), 6);
      const bound = (1 + m) / Math.sqrt((1 + m ** 2 / 2) / 2);
      expect(values.crestFactor).toBeLessThanOrEqual(bound);
      expect(values.crestFactor).toBeGreaterThan(0.999 * bound);
    },
  );
});

describe('the band', () => {
  test.each([
    ['inside', 5000, 1],
    ['in the middle of an edge, half-way up', 2000, 0.5],
    ['below', 1700, 0],
    ['above', 8300, 0],
  ])('a tone %s (%f Hz) has the envelope %f', (_, hz, expected) => {
    const tone = Float64Array.from({ length: 60_000 }, (_, n) =>
      Math.cos((2 * Math.PI * hz * n) / sampleRateHz),
    );
    for (const value of envelopeOf(tone, band)) expect(Math.abs(value - expected)).toBeLessThan(1e-6);
  });

  test('values come at a rate at which nothing asked for is folded, and at no higher one', () => {
    expect(demodulationOf(band).envelopeRateHz).toBe(6400);
    expect(demodulationOf({ ...band, highestHz: 401 }).envelopeRateHz).toBe(12_800);
    expect(demodulationOf({ ...band, fromHz: 3200, toHz: 4800, highestHz: 800 }).envelopeRateHz).toBe(3200);
  });

  test('one that is too narrow or below 0 is refused', () => {
    const narrowest = narrowestBandHz(sampleRateHz);
    expect(narrowest).toBeCloseTo(18.75, 9);
    demodulationOf({ ...band, fromHz: 4000, toHz: 4000 + narrowest });
    expect(() => demodulationOf({ ...band, fromHz: 4000, toHz: 3999.9 + narrowest })).toThrow(RangeError);
    expect(() => demodulationOf({ ...band, fromHz: 0 })).toThrow(RangeError);
    expect(() => envelopeOf(new Float64Array(9), { ...band, toHz: 12_790 })).toThrow(RangeError);
    expect(() => new BandBlocks({ blockSamples: 4096, edgeSamples: 2048 }, () => {})).toThrow(RangeError);
    const shape = { fromHz: 2000, toHz: 6000, edgeHz: 0 };
    expect(() => new BasebandBand(shape, sampleRateHz, 4096, 8)).toThrow(RangeError);
  });
});

test('the envelope is the same bit for bit whatever the size of the blocks that come', () => {
  const samples = gaussianNoise(seededRandom(5), 30_000);
  const whole = envelopeOf(samples, band);
  for (const size of [1, 777, 4096, 29_999]) {
    const pieces: number[] = [];
    const demodulator = new Demodulator(demodulationOf(band), sampleRateHz, (values) =>
      pieces.push(...values),
    );
    for (let at = 0; at < samples.length; at += size) demodulator.add(samples.slice(at, at + size));
    demodulator.finish();
    expect(Float64Array.from(pieces)).toEqual(whole);
  }
});

test.each([0, 1, 547, 548, 549, 552, 553, 4095, 4096, 4097, 7644, 7645, 11_192])(
  'a recording of %i samples gives a value for every fourth one that the filter leaves',
  (count) => {
    const { edgeSamples } = demodulationOf(band);
    expect(edgeSamples).toBe(276);
    const envelope = envelopeOf(modulated(0, { count }), band);
    expect(envelope.length).toBe(Math.max(0, Math.ceil((count - 2 * edgeSamples) / 4)));
    for (const value of envelope) expect(Math.abs(value - 1)).toBeLessThan(1e-3);
  },
);

interface GoldenEnvelope {
  samples: number;
  cases: {
    input: GoldenInput;
    from_hz: number;
    to_hz: number;
    step: number;
    edge_samples: number;
    vertical_edges: number[];
    smooth_edges: number[];
    level: number;
  }[];
}

describe('against scipy.signal.hilbert', () => {
  const golden: GoldenEnvelope = JSON.parse(
    readFileSync(new URL('../golden/envelope.json', import.meta.url), 'utf8'),
  );
  const cases = golden.cases.map((entry) => [entry.from_hz, entry.to_hz, entry] as const);

  test.each(cases)(
    'a recording in one block, band with vertical edges from %f to %f Hz: 1e-10',
    (_, __, entry) => {
      const samples = goldenSamples(golden.samples, entry.input);
      const shape = { fromHz: entry.from_hz, toHz: entry.to_hz, edgeHz: 0 };
      const line = new BasebandBand(shape, sampleRateHz, golden.samples, 1);
      const blocks = new BandBlocks({ blockSamples: golden.samples, edgeSamples: 0 }, (spectrum, good) => {
        expect(good).toEqual([golden.samples, 0]);
        const complex = line.envelope(spectrum, 0);
        entry.vertical_edges.forEach((expected, n) => {
          const at = 2 * n * entry.step;
          expect(Math.abs(Math.hypot(complex[at], complex[at + 1]) - expected)).toBeLessThan(1e-10);
        });
      });
      blocks.add(samples);
      blocks.finish();
      expect.assertions(1 + entry.vertical_edges.length);
    },
  );

  test.each(cases)('block by block, band from %f to %f Hz: 1e-6', (_, __, entry) => {
    const settings = { sampleRateHz, fromHz: entry.from_hz, toHz: entry.to_hz, highestHz: 300 };
    const { edgeSamples, decimation } = demodulationOf(settings);
    expect(edgeSamples).toBe(entry.edge_samples);
    const envelope = envelopeOf(goldenSamples(golden.samples, entry.input), settings);
    let compared = 0;
    entry.smooth_edges.forEach((expected, n) => {
      const sample = n * entry.step;
      // SciPy's band wraps round at the ends of the recording.
      if (sample < 2 * edgeSamples || sample >= golden.samples - 2 * edgeSamples) return;
      const value = envelope[(sample - edgeSamples) / decimation];
      expect(Math.abs(value - expected)).toBeLessThan(1e-6 * Math.max(1, expected));
      compared++;
    });
    expect(compared).toBeGreaterThan(50);
  });

  test.each(cases.slice(0, 3))(
    'level of the envelope of noise, band from %f to %f Hz: within what is folded',
    (fromHz, toHz, entry) => {
      const samples = goldenSamples(golden.samples, entry.input);
      const off = (highestHz: number): number => {
        const settings = { sampleRateHz, fromHz, toHz, highestHz };
        const averaging = { window: 'hann', overlapPercent: 50, lineSpacingHz: 1.6 } as const;
        const averager = new EnvelopeAverager(envelopeAveraging({ ...settings, ...averaging }));
        averager.add(samples);
        const { density, lineSpacingHz } = averager.finish();
        expect(lineSpacingHz).toBe(1.5625);
        const weights = bandWeights(20, 300, { lineSpacingHz, lines: density.length });
        if ('refused' in weights) throw new Error(weights.reason);
        return Math.abs(bandLevel(density, weights) / entry.level - 1);
      };
      expect(off(300)).toBeLessThan(0.025);
      expect(off((toHz - fromHz) / 2)).toBeLessThan(0.001);
    },
  );
});
