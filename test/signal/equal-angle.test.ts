import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { averageDensity } from '../../src/signal/averaging.ts';
import { EqualAngle, passband } from '../../src/signal/equal-angle.ts';
import { findPeaks } from '../../src/signal/peaks.ts';
import { gaussianNoise, seededRandom } from './random.ts';

const sampleRateHz = 5120;
const seconds = 20;
/** 22.5 to 27.5 Hz and on, evenly: 20 % about 25 Hz. */
const sweep = (t: number) => 22.5 * t + 0.125 * t * t;
const speedAt = (t: number) => 22.5 + 0.25 * t;
const meanHz = sweep(seconds) / seconds;

/** When the turns begin, in samples: the sweep solved for the time. */
const turnTimes = Float64Array.from(
  { length: Math.floor(sweep(seconds)) + 1 },
  (_, turn) => ((-22.5 + Math.sqrt(22.5 ** 2 + 0.5 * turn)) / 0.25) * sampleRateHz,
);

const atOrder = (order: number, amplitude: number, phase = 0.4) =>
  Float64Array.from(
    { length: seconds * sampleRateHz },
    (_, n) => amplitude * Math.sin(2 * Math.PI * order * sweep(n / sampleRateHz) + phase),
  );

function equalAngle(samples: Float64Array, samplesPerTurn: number, blocks: readonly number[] = [4096]) {
  const out: number[] = [];
  const speeds: number[] = [];
  const resampler = new EqualAngle({ turnTimes, samplesPerTurn }, (values, turnsPerSample) => {
    out.push(...values);
    speeds.push(...turnsPerSample);
  });
  for (let at = 0, n = 0; at < samples.length; n++) {
    const block = samples.slice(at, at + blocks[n % blocks.length]);
    resampler.add(block);
    at += block.length;
    block.fill(1e9);
  }
  resampler.finish();
  return { samples: Float64Array.from(out), speeds };
}

/** r.m.s. of what differs from a sinusoid at the order, and the sinusoid's amplitude. */
function fitted(samples: Float64Array, order: number, samplesPerTurn: number) {
  let [re, im] = [0, 0];
  const whole = samplesPerTurn * Math.floor(samples.length / samplesPerTurn);
  const step = (2 * Math.PI * order) / samplesPerTurn;
  for (let n = 0; n < whole; n++) {
    re += (2 / whole) * samples[n] * Math.cos(step * n);
    im += (2 / whole) * samples[n] * Math.sin(step * n);
  }
  let squares = 0;
  for (let n = 0; n < whole; n++)
    squares += (samples[n] - re * Math.cos(step * n) - im * Math.sin(step * n)) ** 2;
  return { amplitude: Math.hypot(re, im), rest: Math.sqrt(squares / whole) };
}

describe('samples at equal angles', () => {
  it.each([1, 3, 20, 60])(
    'of a sweep of 20 % make order %i a sinusoid, to 2e-4 of its amplitude',
    (order) => {
      const { amplitude, rest } = fitted(equalAngle(atOrder(order, 1), 205).samples, order, 205);
      expect(Math.abs(amplitude - 1)).toBeLessThan(2e-4);
      expect(rest).toBeLessThan(2e-4);
    },
  );

  it('hold as far as 0.82 of half the rate where the shaft turns fastest, and of half the samples of a turn', () => {
    const highest = passband * (sampleRateHz / 2 / speedAt(seconds));
    const { amplitude, rest } = fitted(
      equalAngle(atOrder(Math.floor(highest), 1), 205).samples,
      Math.floor(highest),
      205,
    );
    expect(Math.abs(amplitude - 1)).toBeLessThan(2e-4);
    expect(rest).toBeLessThan(3e-4);
    const few = Math.floor(passband * 32);
    expect(fitted(equalAngle(atOrder(few, 1), 64).samples, few, 64)).toMatchObject({
      amplitude: expect.closeTo(1, 3),
    });
  });

  it('let nothing fold down that is too high for the samples of a turn', () => {
    // Order 40 at 64 samples a turn would stand at order 24.
    const { samples } = equalAngle(atOrder(40, 1), 64);
    expect(Math.sqrt(samples.reduce((sum, x) => sum + x * x, 0) / samples.length)).toBeLessThan(1e-4);
  });

  it('come with the speed at each of them', () => {
    const { samples, speeds } = equalAngle(atOrder(1, 1), 205);
    expect(speeds).toHaveLength(samples.length);
    expect(speeds[1000] * sampleRateHz).toBeGreaterThan(22.5);
    for (let n = 1000; n < speeds.length; n += 1000) expect(speeds[n]).toBeGreaterThan(speeds[n - 1000]);
    // All but the reach at both ends.
    expect(samples.length / 205).toBeGreaterThan(turnTimes.length - 1 - 2);
  });

  it('do not depend on the size of the blocks', () => {
    const noise = gaussianNoise(seededRandom(1), 3 * sampleRateHz);
    const wanted = equalAngle(noise, 205);
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 1, max: 5000 }), { minLength: 1, maxLength: 6 }), (blocks) => {
        expect(equalAngle(noise, 205, blocks)).toEqual(wanted);
      }),
      { seed: 20261201, numRuns: 6 },
    );
  });

  it('are right in spite of pulses known to a third of a sample only', () => {
    const random = seededRandom(4);
    const jittered = turnTimes.map((time) => time + 0.3 * (2 * random.uniform() - 1));
    const out: number[] = [];
    const resampler = new EqualAngle({ turnTimes: jittered, samplesPerTurn: 205 }, (values) =>
      out.push(...values),
    );
    resampler.add(atOrder(3, 1));
    resampler.finish();
    expect(fitted(Float64Array.from(out), 3, 205).amplitude).toBeCloseTo(1, 3);
  });
});

describe('the spectrum of a tone of three times a shaft that speeds up by 20 %', () => {
  const tone = atOrder(3, Math.SQRT2);
  const noise = gaussianNoise(seededRandom(2), tone.length, 0.3);
  const samples = tone.map((value, n) => value + noise[n]);
  const averaging = { window: 'hann', segmentSamples: 4096, overlapPercent: 50 } as const;
  const peaksOf = (values: Float64Array, rateHz: number) => {
    const { density, averages, hopSamples } = averageDensity(values, { ...averaging, sampleRateHz: rateHz });
    const { peaks } = findPeaks(density, { ...averaging, hopSamples, averages, sampleRateHz: rateHz });
    return { density, peaks };
  };

  it('smears over equal times: the highest line is an eighth, and no tone of half its level is left', () => {
    const { density, peaks } = peaksOf(samples, sampleRateHz);
    const still = averageDensity(
      Float64Array.from(
        { length: tone.length },
        (_, n) => Math.SQRT2 * Math.sin((2 * Math.PI * 75 * n) / sampleRateHz),
      ),
      { ...averaging, sampleRateHz },
    );
    expect(Math.max(...density)).toBeLessThan(0.15 * Math.max(...still.density));
    const near = peaks.filter(({ frequencyHz, kind }) => kind === 'tone' && Math.abs(frequencyHz - 75) < 10);
    expect(near.every(({ level }) => level < 0.5)).toBe(true);
  });

  it('is a single line over equal angles, its level right to half a percent', () => {
    const perTurn = Math.ceil(sampleRateHz / meanHz);
    const { peaks } = peaksOf(equalAngle(samples, perTurn).samples, perTurn * meanHz);
    const [highest] = peaks;
    expect(highest.kind).toBe('tone');
    expect(highest.frequencyHz / meanHz).toBeCloseTo(3, 3);
    expect(Math.abs(highest.level - 1)).toBeLessThan(5e-3);
  });
});
