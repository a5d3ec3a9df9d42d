import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { SampleQuality } from '../../src/acquisition/sample-quality.ts';
import { scalingOf } from '../../src/acquisition/scaling.ts';
import type { Point } from '../../src/config/site.ts';
import { Measurer, type MeasureSettings } from '../../src/manipulation/measure.ts';
import { exceededBy80Percent } from '../../src/manipulation/measure-levels.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';
import { runningSpeed, type SpeedAnswer } from '../../src/manipulation/running-speed.ts';
import { gaussianNoise, seededRandom } from '../signal/random.ts';
import { sines, testBand, testPoint, testSettings } from './point.ts';

const noSpeed: SpeedAnswer = { speed: null, findings: [] };

function measure(
  samples: Float64Array,
  point: Point,
  changes: Partial<MeasureSettings> = {},
  speed: SpeedAnswer = noSpeed,
): Measurement {
  const measurer = new Measurer(testSettings(point, changes));
  measurer.add(samples);
  return finished(measurer, speed);
}

function finished(measurer: Measurer, speed: SpeedAnswer = noSpeed): Measurement {
  measurer.end({ timeStepDeviation: null });
  return measurer.finish(speed);
}

const level = (measurement: Measurement, bandId: string): number => {
  const found = measurement.levels.find((band) => band.bandId === bandId);
  if (found === undefined) throw new Error(`no level of ${bandId}`);
  return found.level;
};
const flags = (measurement: Measurement) => measurement.quality.map(({ flag }) => flag);
const fs = 5120;

describe('band levels of known signals', () => {
  // 10 sin(2 pi 50 t) + 20 sin(2 pi 800 t + 1) + 50 sin(2 pi 5 t) m/s²: velocity from 10 to 1000 Hz is
  // sqrt((10 / (2 pi 50))² / 2 + (20 / (2 pi 800))² / 2) m/s. The 5 Hz tone would add 1.1 m/s.
  const threeTones = sines(20, fs, [
    [10, 50, 0],
    [20, 800, 1],
    [50, 5, 0],
  ]);

  it('integrate acceleration to velocity above the lower edge only', () => {
    const measurement = measure(
      threeTones,
      testPoint({}, { window: 'blackman-harris', lineSpacingHz: 0.625 }),
    );
    expect(level(measurement, 'overall')).toBeCloseTo(0.02268307, 5);
    expect(measurement.averaging).toMatchObject({ segmentSamples: 8192, lineSpacingHz: 0.625, averages: 24 });
  });

  it.each([
    // 1 g r.m.s. at a frequency: velocity in mm/s, displacement in µm, r.m.s.
    [50, 31.21554, 99.36214],
    [100, 15.60777, 24.84053],
    [1000, 1.56078, 0.24841],
  ])('turn 1 g at %s Hz into %s mm/s and %s µm', (hz, velocity, displacement) => {
    const bands = [
      testBand('v', 'velocity', hz / 2, 1.5 * hz),
      testBand('d', 'displacement', hz / 2, 1.5 * hz),
      testBand('a', 'acceleration', hz / 2, 1.5 * hz),
    ];
    const samples = sines(10, fs, [[9.80665 * Math.SQRT2, hz, 0.4]]);
    const measurement = measure(samples, testPoint({ bands }));
    expect(Math.abs(level(measurement, 'v') / (1e-3 * velocity) - 1)).toBeLessThan(2e-3);
    expect(Math.abs(level(measurement, 'd') / (1e-6 * displacement) - 1)).toBeLessThan(5e-3);
    expect(Math.abs(level(measurement, 'a') / 9.80665 - 1)).toBeLessThan(1e-4);
  });

  it('go from codes through full scale and sensitivity to SI', () => {
    // 16-bit codes of a recorder with 10 V full scale behind 100 mV/g: 0.1 of full scale is 1 V, 10 g.
    const signal = {
      samplesIn: { text: 'V', quantity: 'voltage', inSi: 1 },
      fullScale: 10,
      sensitivity: 0.1 / 9.80665,
      sensitivityText: '100 mV/g',
    } as const;
    const scaling = scalingOf('integer', 'acceleration', signal);
    if ('reason' in scaling) throw new Error(scaling.reason);
    const bands = [testBand('a', 'acceleration', 50, 150)];
    const samples = sines(5, fs, [[0.1 * Math.SQRT2, 100, 0]]);
    const measurement = measure(samples, testPoint({ bands, signal }), { ...scaling });
    expect(Math.abs(level(measurement, 'a') / 98.0665 - 1)).toBeLessThan(1e-4);
    expect(measurement.peaks[0]).toMatchObject({ kind: 'tone', frequencyHz: expect.closeTo(100, 2) });
    expect(Math.abs(measurement.peaks[0].level / 98.0665 - 1)).toBeLessThan(5e-3);
    expect(measurement).toMatchObject({ unit: 'm/s²', quantity: 'acceleration', channel: '1' });
  });

  it('lie inside their interval, which narrows with the number of averages', () => {
    const bands = [testBand('a', 'acceleration', 500, 1500)];
    const width = (seconds: number) => {
      const noise = gaussianNoise(seededRandom(3), seconds * fs, 2);
      const [found] = measure(noise, testPoint({ bands })).levels;
      expect(found.intervalLow).toBeLessThan(found.level);
      expect(found.intervalHigh).toBeGreaterThan(found.level);
      expect(found.confidencePercent).toBe(95);
      return found.intervalHigh / found.intervalLow;
    };
    expect(width(40)).toBeLessThan(width(4));
    expect(width(4)).toBeLessThan(1.2);
  });

  it('of bands in orders follow the speed; the sidecar goes before the nominal one', () => {
    const bands = [testBand('1x', 'acceleration', 0.8, 1.2, true)];
    const samples = sines(10, fs, [
      [1, 18, 0],
      [3, 30, 0],
    ]);
    const point = testPoint({ bands });
    const nominal = measure(samples, point, {}, runningSpeed({ sidecarRpm: null, nominalHz: 20 }));
    expect(nominal.speed).toMatchObject({
      rpm: 1200,
      origin: 'nominal',
      uncertaintyRpm: expect.closeTo(36, 9),
    });
    expect(nominal.levels[0]).toMatchObject({ fromHz: 16, toHz: 24 });
    const sidecar = { loadPercent: 60, running: true };
    const told = measure(samples, point, { sidecar }, runningSpeed({ sidecarRpm: 1800, nominalHz: 20 }));
    expect(told).toMatchObject({
      loadPercent: 60,
      runningSaid: true,
      speed: { rpm: 1800, origin: 'sidecar' },
    });
    expect(told.levels[0].level).toBeCloseTo(3 / Math.SQRT2, 2);
    expect(told.peaks[0].order).toBeCloseTo(1, 3);
    expect(told.levels[0].fingerprint).toBe(nominal.levels[0].fingerprint);
    const unknown = measure(samples, testPoint({ bands }));
    expect(unknown.levels).toEqual([]);
    expect(unknown.quality).toEqual([{ flag: 'speed-doubtful', detail: expect.stringContaining('band 1x') }]);
    expect(unknown.peaks[0].order).toBeNull();
  });

  it('are missing, and it is said, where a band reaches beyond half the sample rate', () => {
    const measurement = measure(sines(5, 2560, [[1, 100, 0]]), testPoint(), { sampleRateHz: 2560 });
    expect(measurement.levels.map((band) => band.bandId)).toEqual(['overall']);
    expect(measurement.quality).toEqual([
      { flag: 'wrong-rate', detail: expect.stringContaining('band bearing') },
    ]);
  });

  it('are analysed at the recording’s own rate, and it is said, where that is not the configured one', () => {
    const recordings = { ...testPoint().recordings, sampleRateHz: 5120 };
    const at = (sampleRateHz: number) =>
      measure(sines(5, sampleRateHz, [[1, 100, 0]]), testPoint({ recordings }), { sampleRateHz });
    expect(flags(at(5120))).toEqual([]);
    expect(flags(at(5124))).toEqual([]);
    const other = at(10_240);
    expect(flags(other)).toEqual(['wrong-rate']);
    expect(other.averaging).toMatchObject({ segmentSamples: 8192, lineSpacingHz: 1.25 });
    expect(level(other, 'overall')).toBeCloseTo(1 / Math.SQRT2 / (2 * Math.PI * 100), 5);
    expect(other.levels[0].fingerprint).not.toBe(at(5120).levels[0].fingerprint);
    expect(at(5124).levels[0].fingerprint).toBe(at(5120).levels[0].fingerprint);
  });
});

describe('the level that 80 % of the segments exceed', () => {
  it('is null below five averages, then the largest that four of five reach', () => {
    expect(exceededBy80Percent([1, 4, 9, 16])).toBeNull();
    expect(exceededBy80Percent([25, 1, 4, 9, 16])).toBe(2);
    expect(exceededBy80Percent([1, 4, 9, 16, 25, 36, 49, 64, 81, 100])).toBe(3);
  });

  it('stays low when a single burst lifts the level', () => {
    const samples = sines(20, fs, [[1, 100, 0]]);
    for (let n = 10 * fs; n < 10.5 * fs; n++) samples[n] *= 30;
    const bands = [testBand('a', 'acceleration', 50, 150)];
    const [found] = measure(samples, testPoint({ bands })).levels;
    expect(found.level).toBeGreaterThan(2.5);
    expect(found.exceededBy80Percent).toBeCloseTo(Math.SQRT1_2, 2);
  });
});

describe('the steadiness of a measurement', () => {
  const noisy = (change: (n: number) => number) => {
    const tone = sines(40, fs, [[1, 100, 0]]);
    const noise = gaussianNoise(seededRandom(21), tone.length, 0.1);
    return tone.map((value, n) => value * change(n) + noise[n]);
  };

  it('is a ratio below 1 for a steady machine, and null below four averages', () => {
    const steady = measure(
      noisy(() => 1),
      testPoint(),
    );
    expect(steady.averaging?.segmentSpread).toBeGreaterThan(0);
    expect(steady.averaging?.segmentSpread).toBeLessThan(1);
    expect(flags(steady)).toEqual([]);
    expect(measure(sines(1.5, fs, [[1, 100, 0]]), testPoint()).averaging).toMatchObject({
      averages: 2,
      segmentSpread: null,
    });
  });

  it('is flagged, with what varied, where the shaft’s level doubles within the recording', () => {
    const doubling = measure(
      noisy((n) => 2 ** (n / (40 * fs))),
      testPoint(),
    );
    expect(doubling.averaging?.segmentSpread).toBeGreaterThan(1);
    expect(doubling.quality).toEqual([{ flag: 'unsteady', detail: expect.stringContaining('100 Hz') }]);
    expect(doubling.levels).toHaveLength(2);
  });
});

describe('a recording that cannot be measured whole', () => {
  it('gives waveform values only, and says so, when it is shorter than a segment', () => {
    const measurement = measure(sines(0.5, fs, [[1, 100, 0]]), testPoint());
    expect(measurement).toMatchObject({
      averaging: null,
      levels: [],
      peaks: [],
      spectrum: null,
      durationS: 0.5,
    });
    expect(measurement.waveform?.rms).toBeCloseTo(Math.SQRT1_2, 6);
    expect(flags(measurement)).toEqual(['too-short']);
  });

  it('gives the longest clean stretch where samples are no numbers', () => {
    const samples = gaussianNoise(seededRandom(5), 20 * fs);
    const clean = samples.slice(4 * fs + 1, 15 * fs);
    samples[4 * fs] = Number.NaN;
    samples[15 * fs] = Number.POSITIVE_INFINITY;
    const check = new SampleQuality({
      samples: 'number',
      sampleRateHz: fs,
      quantity: 'acceleration',
      voltsPerSample: null,
    });
    const measurement = measure(samples, testPoint(), { check });
    const wanted = measure(clean, testPoint());
    expect({ ...measurement, quality: [] }).toEqual({ ...wanted, quality: [] });
    expect(flags(measurement)).toEqual(['not-a-number']);
  });

  it('gives the longest stretch without a sample that no sensor gives, and finite numbers only', () => {
    const samples = gaussianNoise(seededRandom(5), 20 * fs);
    const clean = samples.slice(4 * fs + 1);
    samples[4 * fs] = -1e30;
    const measurement = measure(samples, testPoint());
    expect(measurement).toEqual(measure(clean, testPoint()));
    samples.fill(1e300);
    expect(measure(samples, testPoint())).toMatchObject({ waveform: null, levels: [], durationS: 0 });
  });

  it('gives nothing but its flags when no sample is a number', () => {
    const measurement = measure(new Float64Array(3 * fs).fill(Number.NaN), testPoint());
    expect(measurement).toMatchObject({ waveform: null, levels: [], durationS: 0 });
    expect(flags(measurement)).toEqual(['too-short']);
  });

  it('leaves the start out that is to be skipped', () => {
    const samples = sines(10, fs, [[1, 100, 0]]);
    samples.fill(1000, 0, fs);
    const measurement = measure(samples, testPoint({}, { skipStartS: 1 }));
    expect(measurement.waveform?.peak).toBeCloseTo(1, 3);
    expect(measurement.durationS).toBe(9);
  });

  it('gives waveform values only where the time column is uneven, or no rate is known', () => {
    const samples = sines(5, fs, [[1, 100, 0]]);
    const measurer = new Measurer(testSettings(testPoint()));
    measurer.add(samples);
    expect(measurer.end({ timeStepDeviation: 0.5 })).toBeNull();
    const uneven = measurer.finish(noSpeed);
    expect(uneven).toMatchObject({ levels: [], spectrum: null, averaging: null });
    expect(flags(uneven)).toEqual(['uneven-time']);
    const noRate = measure(samples, testPoint(), { sampleRateHz: null });
    expect(flags(noRate)).toEqual(['wrong-rate']);
    expect(noRate.waveform?.rms).toBeCloseTo(Math.SQRT1_2, 6);
  });

  it('marks levels as at least so much where the recording is clipped', () => {
    const check = { add: () => {}, finish: () => [{ flag: 'clipped', detail: '' }] as const };
    const measurement = measure(sines(5, fs, [[1, 100, 0]]), testPoint(), { check });
    expect(measurement.levels.every((band) => band.atLeast)).toBe(true);
    expect(measure(sines(5, fs, [[1, 100, 0]]), testPoint()).levels.some((band) => band.atLeast)).toBe(false);
  });

  it('holds no NaN, whatever it was made of', () => {
    for (const samples of [new Float64Array(0), new Float64Array(3 * fs), new Float64Array(3 * fs).fill(2)]) {
      const { spectrum, ...rest } = measure(samples, testPoint());
      expect(spectrum?.density.every(Number.isFinite) ?? true).toBe(true);
      expect(JSON.parse(JSON.stringify(rest))).toEqual(rest);
    }
  });

  it('is refused loudly where the site file’s check must have refused it', () => {
    const point = testPoint({ quantity: 'displacement', bands: [testBand('v', 'velocity', 10, 1000)] });
    expect(() => new Measurer(testSettings(point))).toThrow(/band v/);
  });
});

describe('a measurement', () => {
  it('does not depend on the size of the blocks it was fed', () => {
    const random = seededRandom(11);
    const samples = gaussianNoise(random, 6 * fs);
    for (const at of [100, 3000, 3001, 17_000]) samples[at] = Number.NaN;
    const point = testPoint({}, { skipStartS: 0.1 });
    const wanted = measure(samples, point);
    expect(wanted.levels).toHaveLength(2);
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 1, max: 9000 }), { minLength: 1, maxLength: 12 }), (sizes) => {
        const measurer = new Measurer(testSettings(point));
        for (let at = 0, n = 0; at < samples.length; n++) {
          const size = sizes[n % sizes.length];
          // A reader lends its block: what it overwrites afterwards must not matter.
          const block = samples.slice(at, at + size);
          measurer.add(block);
          block.fill(1e9);
          at += size;
        }
        expect(finished(measurer)).toEqual(wanted);
      }),
      { seed: 20261201, numRuns: 15 },
    );
  });

  it('takes no memory that grows with the recording', () => {
    const measurer = new Measurer(testSettings(testPoint()));
    const block = gaussianNoise(seededRandom(2), 65_536);
    for (let n = 0; n < 20; n++) measurer.add(block);
    const before = process.memoryUsage();
    // 128 MiB of samples.
    for (let n = 0; n < 256; n++) measurer.add(block);
    const after = process.memoryUsage();
    const grown = after.arrayBuffers - before.arrayBuffers;
    expect(grown).toBeLessThan(16 * 2 ** 20);
    expect(finished(measurer).averaging?.averages).toBeGreaterThan(8000);
  });

  it('takes no memory for a segment that the recording does not fill', () => {
    const before = process.memoryUsage().arrayBuffers;
    const absurd = new Measurer(testSettings(testPoint(), { sampleRateHz: 3e6 }));
    absurd.add(new Float64Array(1000));
    expect(process.memoryUsage().arrayBuffers - before).toBeLessThan(2 ** 20);
    expect(flags(finished(absurd))).toContain('too-short');
  });
});
