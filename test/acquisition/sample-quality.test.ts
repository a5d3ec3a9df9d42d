import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { QualityFlag } from '../../src/acquisition/recording.ts';
import { SampleQuality, type SampleQualitySettings } from '../../src/acquisition/sample-quality.ts';
import type { MachineLook } from '../../src/acquisition/spectrum-quality.ts';
import { averageDensity } from '../../src/signal/averaging.ts';
import { gaussianNoise, seededRandom } from '../signal/random.ts';
import { healthySignal, quantised, sampleRateHz } from './signals.ts';

type Settings = SampleQualitySettings & MachineLook;

const usual: Settings = {
  samples: 'integer',
  sampleRateHz,
  quantity: 'acceleration',
  voltsPerSample: null,
  lowestVelocityHz: null,
  speedHz: null,
};

function findings(samples: Float64Array, settings: Partial<Settings> = {}) {
  const quality = new SampleQuality({ ...usual, ...settings });
  quality.add(samples);
  const finite = samples.every(Number.isFinite);
  const spectrum = averageDensity(finite ? samples : samples.map((x) => (Number.isFinite(x) ? x : 0)), {
    window: 'hann',
    segmentSamples: 4096,
    overlapPercent: 50,
    sampleRateHz,
  });
  return quality.finish(spectrum, { ...usual, ...settings });
}

const flags = (samples: Float64Array, settings: Partial<Settings> = {}): QualityFlag[] =>
  findings(samples, settings).map(({ flag }) => flag);

const noise = (seed: number, deviation = 0.1) =>
  quantised(gaussianNoise(seededRandom(seed), 2 * sampleRateHz, deviation));

const sine = (hz: number, amplitude: number, phase = 0.3) =>
  Float64Array.from(
    { length: 2 * sampleRateHz },
    (_, n) => amplitude * Math.sin((2 * Math.PI * hz * n) / sampleRateHz + phase),
  );

const sum = (...parts: Float64Array[]) =>
  parts[0].map((_, n) => parts.reduce((total, part) => total + part[n], 0));

describe('the sample quality of a healthy recording', () => {
  it('raises nothing on 1,000 simulated machines', () => {
    const wrong: string[] = [];
    for (let seed = 1; seed <= 1000; seed++) {
      const { samples, speedHz } = healthySignal(seed);
      for (const { flag, detail } of findings(samples, { speedHz, lowestVelocityHz: 20 }))
        wrong.push(`seed ${seed}: ${flag}: ${detail}`);
    }
    expect(wrong).toEqual([]);
  });

  it.each([5, 50, 297.3, 1600, 3200])('raises nothing on a pure tone of %s Hz, at any drive', (hz) => {
    for (const amplitude of [0.9, 0.1, 0.003]) {
      const found = flags(quantised(sine(hz, amplitude)));
      expect(found, `amplitude ${amplitude}`).toEqual([]);
    }
  });

  it('raises nothing where slow tones without noise turn, at the extremes and below them', () => {
    expect(flags(quantised(sum(sine(5, 0.06), sine(6, 0.05))))).toEqual([]);
  });

  it('raises nothing where the shaft turns at the very edge of the band', () => {
    for (let seed = 1001; seed <= 1200; seed++) {
      for (const lowestVelocityHz of [10, 15.6]) {
        const { samples, speedHz } = healthySignal(seed, 1, lowestVelocityHz * (0.9 + 0.001 * (seed - 1000)));
        expect(flags(samples, { speedHz, lowestVelocityHz }), `seed ${seed}`).toEqual([]);
      }
    }
  });

  it('raises nothing on a slow shaft whose multiples crowd the lowest lines', () => {
    for (let seed = 1; seed <= 100; seed++) {
      const speedHz = 5 + 0.05 * seed;
      const multiples = [1, 2, 3, 4, 5, 6].map((k) => sine(k * speedHz, 0.08 / k, seed * k));
      const samples = quantised(sum(gaussianNoise(seededRandom(seed), 2 * sampleRateHz, 0.01), ...multiples));
      expect(flags(samples, { speedHz, lowestVelocityHz: 20 }), `seed ${seed}`).toEqual([]);
    }
  });

  it('raises nothing on numbers with few digits, as CSV files have them', () => {
    const samples = sum(sine(25, 3), gaussianNoise(seededRandom(7), 2 * sampleRateHz, 0.3));
    expect(
      flags(
        samples.map((x) => Number(x.toFixed(2))),
        { samples: 'number' },
      ),
    ).toEqual([]);
  });
});

describe('the sample quality of a bad recording', () => {
  it('tells clipping at full scale, and below it where an amplifier clips', () => {
    const loud = sum(sine(120, 0.9), noise(1, 0.2));
    expect(flags(quantised(loud))).toContain('clipped');
    expect(flags(quantised(loud.map((x) => Math.max(-0.6, Math.min(0.6, x)))))).toContain('clipped');
    const numbers = loud.map((x) => 9.81 * Math.max(-0.7, Math.min(0.7, x)));
    expect(flags(numbers, { samples: 'number' })).toContain('clipped');
  });

  it('tells a saturated sensor by the time at the rail, or by its mean', () => {
    expect(flags(quantised(sum(sine(30, 2), noise(2))))).toEqual(
      expect.arrayContaining(['clipped', 'saturated']),
    );
    expect(flags(quantised(noise(3, 0.01).map((x) => x + 0.9)))).toContain('saturated');
  });

  it('tells a dead channel, silent or within two codes', () => {
    expect(flags(new Float64Array(sampleRateHz))).toEqual(['flat']);
    expect(flags(new Float64Array(sampleRateHz).fill(0.25))).toEqual(['flat']);
    expect(flags(quantised(gaussianNoise(seededRandom(4), sampleRateHz, 1e-5)))).toEqual(['flat']);
  });

  it('tells dropouts that hold the last value or fall to zero', () => {
    const held = noise(5);
    held.fill(held[4999], 5000, 5040);
    expect(flags(held)).toEqual(['dropouts']);
    const zeroed = noise(6);
    for (const at of [3000, 9000, 15_000]) zeroed.fill(0, at, at + 20);
    const [found] = findings(zeroed);
    expect(found).toMatchObject({ flag: 'dropouts', detail: expect.stringMatching(/^3 rows .* 60 in all/) });
  });

  it('tells no dropout where two short rows have a gap between them', () => {
    const broken = noise(15);
    broken.fill(broken[5000], 5000, 5024);
    broken[5012] = Number.NaN;
    expect(flags(broken)).toEqual(['not-a-number']);
  });

  it('tells samples that are no numbers, and how long a stretch is left', () => {
    const broken = noise(7);
    broken[100] = Number.NaN;
    broken[20_000] = Number.POSITIVE_INFINITY;
    expect(findings(broken)).toEqual([
      {
        flag: 'not-a-number',
        detail: '2 of 25600 samples are no usable numbers; the longest stretch without one has 19899',
      },
    ]);
  });

  it('tells a sensor that still settles, and names the remedy', () => {
    const start = noise(8, 0.03).map((x, n) => x + 0.5 * Math.exp(-n / (0.05 * sampleRateHz)));
    expect(findings(quantised(start))).toEqual([
      { flag: 'settling', detail: expect.stringContaining('skip_start') },
    ]);
    const slow = noise(9, 0.03).map((x, n) => x + 0.5 * Math.exp(-n / (0.4 * sampleRateHz)));
    expect(flags(quantised(slow))).toContain('settling');
  });

  it.each([
    [24, true],
    [18, true],
    [13.5, true],
    [10.5, false],
    [8.01, false],
    [5, true],
    [-3, true],
    [0.4, false],
    [0, false],
  ])('judges a bias of %s V: out of range %s', (volts, out) => {
    const samples = noise(10, 0.001).map((x) => x + volts / 25);
    expect(flags(samples, { voltsPerSample: 25 }).includes('bias-out-of-range')).toBe(out);
    expect(flags(samples)).not.toContain('bias-out-of-range');
  });

  it.each([50, 60])('tells a cable that picks up %s Hz and nothing else', (mains) => {
    const hum = sum(
      sine(mains * 1.002, 0.4),
      sine(3 * mains * 1.002, 0.2),
      sine(5 * mains * 1.002, 0.05),
      noise(11, 0.002),
    );
    expect(flags(quantised(hum))).toContain('hum-only');
    expect(flags(quantised(hum), { speedHz: mains / 2 })).not.toContain('hum-only');
    expect(flags(quantised(sum(hum, sine(24.3, 0.2))))).not.toContain('hum-only');
  });

  it.each([50, 60])('takes no lightly loaded two-pole motor for hum at %s Hz', (mains) => {
    const shaft = 0.996 * mains;
    const motor = quantised(
      sum(sine(shaft, 0.2), sine(2 * shaft, 0.15), sine(3 * shaft, 0.08), noise(14, 0.002)),
    );
    expect(flags(motor)).not.toContain('hum-only');
    for (const plate of [0.94, 0.96, 0.99, 1])
      expect(flags(motor, { speedHz: plate * mains }), `plate ${plate}`).not.toContain('hum-only');
    // The same lines on a shaft that cannot give them.
    expect(flags(motor, { speedHz: 0.37 * mains })).toContain('hum-only');
  });

  it('tells a velocity that is nothing but its slope', () => {
    // White noise of the sensor, integrated: 1/f; a drifting input: steeper.
    const lowestVelocityHz = 20;
    expect(flags(noise(12, 0.01), { lowestVelocityHz })).toContain('ski-slope');
    let drift = 0;
    const drifting = noise(13, 0.01).map((x) => {
      drift = 0.999 * drift + 0.05 * x;
      return x + drift;
    });
    expect(flags(quantised(drifting), { lowestVelocityHz })).toContain('ski-slope');
    // As even as the first but far louder than a sensor's own noise: a pump that cavitates.
    const loud = noise(12, 0.01).map((x) => 300 * x);
    expect(flags(loud, { lowestVelocityHz, samples: 'number' })).not.toContain('ski-slope');
    expect(flags(noise(12, 0.01))).not.toContain('ski-slope');
    expect(flags(sum(noise(12, 0.01), sine(24, 0.05)), { lowestVelocityHz })).not.toContain('ski-slope');
  });
});

describe('the sample quality', () => {
  it('does not depend on the size of the blocks', () => {
    const samples = sum(noise(14, 0.2), sine(100, 0.9));
    samples[77] = Number.NaN;
    samples.fill(0.125, 500, 540);
    const whole = new SampleQuality(usual);
    whole.add(quantised(samples));
    const wanted = whole.finish(null, usual);
    expect(wanted.length).toBeGreaterThan(2);
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 1, max: 5000 }), { minLength: 1, maxLength: 20 }), (sizes) => {
        const quality = new SampleQuality(usual);
        const all = quantised(samples);
        for (let at = 0, n = 0; at < all.length; n++) {
          const size = sizes[n % sizes.length];
          quality.add(all.subarray(at, at + size));
          at += size;
        }
        expect(quality.finish(null, usual)).toEqual(wanted);
      }),
      { seed: 20261201, numRuns: 30 },
    );
  });

  it('keeps bounded lists on a recording made of nothing but rows', () => {
    const quality = new SampleQuality(usual);
    const block = Float64Array.from({ length: 3_000_000 }, (_, n) => ((n >> 2) % 2) * 0.5);
    quality.add(block);
    expect(quality.finish(null, usual).map(({ flag }) => flag)).not.toContain('not-a-number');
  });
});
