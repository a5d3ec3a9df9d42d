import { describe, expect, test } from 'vitest';
import { BasebandBand } from '../../src/signal/band-blocks.ts';
import { Kurtogram } from '../../src/signal/kurtogram.ts';
import { kurtosisOfNoise, worthOfValue } from '../../src/signal/kurtosis-noise.ts';
import { hiddenImpacts } from './hidden-impacts.ts';
import { bandsFound, kurtogramOf, noisePassing } from './kurtogram-trials.ts';
import { gaussianNoise, seededRandom } from './random.ts';

const sampleRateHz = 25_600;

test('the map holds bands of half, a third, a quarter, a sixth ... of the range, as Antoni 2007 cuts it', () => {
  const { bands } = kurtogramOf(gaussianNoise(seededRandom(1), 100_000), { lowestHz: 0, highestHz: 12_800 });
  const widths = new Map<number, number>();
  for (const { fromHz, toHz } of bands) {
    const parts = Math.round(12_800 / (toHz - fromHz));
    widths.set(parts, (widths.get(parts) ?? 0) + 1);
    expect(fromHz / (toHz - fromHz)).toBeCloseTo(Math.round(fromHz / (toHz - fromHz)), 9);
  }
  // 12.8 kHz / 16 = 800 Hz is the narrowest asked for; the bands of a level lie side by side.
  expect([...widths]).toEqual([1, 2, 3, 4, 6, 8, 12, 16].map((parts) => [parts, parts]));
});

test('only bands within the range that the sensor serves take part', () => {
  const { bands } = kurtogramOf(gaussianNoise(seededRandom(1), 50_000), { lowestHz: 1000, highestHz: 8000 });
  for (const { fromHz, toHz } of bands) {
    expect(fromHz).toBeGreaterThanOrEqual(1000);
    expect(toHz).toBeLessThanOrEqual(8000.1);
  }
  expect(bands.length).toBeGreaterThan(10);
  expect(kurtogramOf(new Float64Array(50_000), { highestHz: 600 })).toEqual({
    bands: [],
    best: null,
    passes: false,
  });
});

describe('kurtosis of a band', () => {
  test('is -1 for a steady tone, and 0 for noise within four standard errors', () => {
    const tone = Float64Array.from({ length: 100_000 }, (_, n) => Math.cos(1.1 * n));
    const hz = (1.1 / (2 * Math.PI)) * sampleRateHz;
    const around = kurtogramOf(tone).bands.filter(({ fromHz, toHz }) => fromHz < hz && hz < toHz);
    expect(around.length).toBeGreaterThan(4);
    for (const { kurtosis } of around) expect(kurtosis).toBeCloseTo(-1, 3);
    const noise = gaussianNoise(seededRandom(2), 256_000);
    for (const { kurtosis, fromHz, toHz } of kurtogramOf(noise).bands) {
      expect(Math.abs(kurtosis)).toBeLessThan(4 * Math.sqrt(4 / (10 * (toHz - fromHz))));
    }
  });

  test('is 1/p - 2 for carrier bursts that fill a part p of the time', () => {
    // Bursts far longer than any filter rings: 0.2 s in each 2 s.
    const samples = Float64Array.from({ length: 512_000 }, (_, n) => {
      return n % 51_200 >= 20_000 && n % 51_200 < 25_120 ? Math.cos(0.9 * n) : 0;
    });
    const hz = (0.9 / (2 * Math.PI)) * sampleRateHz;
    const around = kurtogramOf(samples).bands.filter(
      ({ fromHz, toHz }) => hz - fromHz > 300 && toHz - hz > 300,
    );
    expect(around.length).toBeGreaterThan(2);
    for (const { kurtosis } of around) expect(Math.abs(kurtosis - 8)).toBeLessThan(0.1);
  });
});

test('the map is the same bit for bit whatever the size of the blocks that come', () => {
  const samples = gaussianNoise(seededRandom(5), 40_000);
  const kurtogram = new Kurtogram({ sampleRateHz, lowestHz: 500, highestHz: 10_000, narrowestHz: 800 });
  for (let at = 0; at < samples.length; at += 1237) kurtogram.add(samples.slice(at, at + 1237));
  expect(kurtogram.finish()).toEqual(kurtogramOf(samples));
});

describe('what noise alone may show', () => {
  test('independent values: the moments are exact, the mean -2 / (n + 1), the spread 2 / sqrt n', () => {
    for (const values of [400, 1000, 100_000]) {
      const median = kurtosisOfNoise(values, 0.5);
      const wide = kurtosisOfNoise(values, 0.1587) - kurtosisOfNoise(values, 0.8413);
      expect(Math.abs(wide / 2 / (2 / Math.sqrt(values)) - 1)).toBeLessThan(0.06);
      expect(median).toBeLessThan(0);
    }
    expect(kurtosisOfNoise(399, 0.001)).toBe(Number.POSITIVE_INFINITY);
  });

  test('1 in 100 and 1 in 1000 of seeded draws of 1000 values lie above their points', () => {
    const random = seededRandom(20261201);
    const draws = 20_000;
    const above = [0.01, 0.001].map((probability) => ({
      point: kurtosisOfNoise(1000, probability),
      count: 0,
    }));
    for (let draw = 0; draw < draws; draw++) {
      let [sum, squares] = [0, 0];
      for (let n = 0; n < 1000; n++) {
        const power = -Math.log(1 - random.uniform());
        sum += power;
        squares += power * power;
      }
      const kurtosis = (1000 * squares) / sum ** 2 - 2;
      for (const one of above) if (kurtosis > one.point) one.count++;
    }
    // 200 and 20 are expected; four standard errors either way.
    expect(Math.abs(above[0].count - 200)).toBeLessThan(57);
    expect(Math.abs(above[1].count - 20)).toBeLessThan(18);
  });

  test('values of a band at twice its width are worth less than one each, at its width one', () => {
    const vertical = { fromHz: 3200, toHz: 6399, edgeHz: 0 };
    const at = (decimation: number) => {
      const band = new BasebandBand(vertical, sampleRateHz, 4096, decimation);
      return worthOfValue(band.amplitudes, 4096 / decimation);
    };
    expect(at(8)).toBeCloseTo(1, 2);
    // Integral of sinc^4: 2 / 3.
    expect(at(4)).toBeCloseTo(0.75, 2);
  });

  test('of 1000 recordings of noise, at most four have a band above its noise point', () => {
    expect(noisePassing(1000, 1, 3)).toBeLessThanOrEqual(4);
  });

  test('a recording too short to say anything about a band does not let it pass', () => {
    const impacts = hiddenImpacts(seededRandom(1), {
      sampleRateHz,
      durationS: 0.06,
      impactsPerS: 75,
      resonanceHz: 4000,
      halfWidthHz: 150,
      aboveNoiseDb: 20,
      slip: 0,
    });
    expect(kurtogramOf(impacts)).toMatchObject({ best: null, passes: false });
  });
});

test.each([50, 75, 100])('a band 10 dB below the noise is found at %i impacts a second', (impactsPerS) => {
  expect(bandsFound(impactsPerS, 8)).toBe(8);
});
