import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { type PulseSettings, PulseSpeed, type TurnSpeed, turnSpeed } from '../../src/signal/pulse-speed.ts';
import { type PulseChannel, pulseChannel } from './pulse-channel.ts';
import { gaussianNoise, seededRandom } from './random.ts';

const sampleRateHz = 25_600;

function answerOf(samples: Float64Array, settings: Partial<PulseSettings> = {}) {
  const speed = new PulseSpeed({ sampleRateHz, pulsesPerTurn: 1, threshold: null, ...settings });
  speed.add(samples);
  return speed.finish();
}

function speedOf(samples: Float64Array, settings: Partial<PulseSettings> = {}): TurnSpeed {
  const answer = answerOf(samples, settings);
  if ('refused' in answer) throw new Error(answer.refused);
  return answer;
}

function refusal(samples: Float64Array, settings: Partial<PulseSettings> = {}): string {
  const answer = answerOf(samples, settings);
  return 'refused' in answer ? answer.refused : `${answer.meanHz} Hz`;
}

const channel = (changes: Partial<PulseChannel>, seed = 1) =>
  pulseChannel({ sampleRateHz, seconds: 4, turnsAt: (t) => 24.37 * t, ...changes }, seededRandom(seed));

describe('the speed from a pulse channel', () => {
  it.each([
    ['one mark a turn', { duty: 0.02 }, 1, 2e-5],
    ['a mark of two samples', { duty: 0.002 }, 1, 2e-5],
    ['a wheel of 60 teeth', { pulsesPerTurn: 60, duty: 0.5 }, 60, 1e-5],
    ['a notch: the pulse goes down', { low: -5, high: -18, duty: 0.05 }, 1, 2e-5],
    ['noise of a twentieth of the range', { noise: 0.25, duty: 0.1 }, 1, 5e-5],
  ])('is right to a few parts in 100,000: %s', (_name, changes, pulsesPerTurn, largest) => {
    for (let seed = 1; seed <= 5; seed++) {
      const speed = speedOf(channel(changes, seed), { pulsesPerTurn });
      expect(Math.abs(speed.meanHz / 24.37 - 1), `seed ${seed}`).toBeLessThan(largest);
      expect(Math.abs(speed.meanHz - 24.37), `seed ${seed}`).toBeLessThan(speed.uncertaintyHz);
      expect(speed.uncertaintyHz / 24.37).toBeLessThan(2e-4);
      expect(speed).toMatchObject({ missed: 0, doubled: 0 });
      expect(speed.highestHz / speed.lowestHz).toBeLessThan(1.003);
    }
  });

  it('times a rise between two samples: of a sine at 20 samples a period to 2 % of a sample', () => {
    const samples = Float64Array.from({ length: 40_000 }, (_, n) =>
      Math.sin((2 * Math.PI * (n - 3.3)) / 20.37),
    );
    for (const [turn, time] of speedOf(samples).turnTimes.entries())
      expect(Math.abs(time - 20.37 * turn - 3.3)).toBeLessThan(0.02);
  });

  it('counts slow rises once in spite of noise that goes to and fro across the threshold', () => {
    const random = seededRandom(6);
    const samples = Float64Array.from(
      { length: 100_000 },
      (_, n) => Math.sin((2 * Math.PI * n) / 1000) + 0.05 * random.gaussian(),
    );
    const speed = speedOf(samples);
    expect(speed).toMatchObject({ missed: 0, doubled: 0 });
    expect(Math.abs(speed.meanHz / 25.6 - 1)).toBeLessThan(5e-4);
  });

  it('times the turns of a shaft that speeds up by a fifth, and says from where to where', () => {
    // 20 to 24 Hz within 4 s, evenly.
    const speed = speedOf(channel({ turnsAt: (t) => 20 * t + 0.5 * t * t }));
    expect(speed.lowestHz).toBeGreaterThan(20);
    expect(speed.lowestHz).toBeLessThan(20.3);
    expect(speed.highestHz).toBeGreaterThan(23.7);
    expect(speed.highestHz).toBeLessThan(24.01);
    expect(speed.meanHz).toBeCloseTo(22, 1);
    for (const [turn, time] of speed.turnTimes.entries()) {
      const seconds = time / sampleRateHz;
      expect(20 * seconds + 0.5 * seconds ** 2).toBeCloseTo(turn + (speed.turnTimes[0] > 1 ? 1 : 0), 2);
    }
  });

  it('repairs missed and doubled pulses and counts them', () => {
    for (const pulsesPerTurn of [1, 4]) {
      const changes = {
        turnsAt: (t: number) => 20 * t + 0.3 * t * t,
        pulsesPerTurn,
        duty: 0.1,
        missed: new Set([13, 40, 41, 60]),
        doubled: new Set([25, 50]),
      };
      const speed = speedOf(channel(changes), { pulsesPerTurn });
      expect(speed).toMatchObject({ missed: 4, doubled: 2 });
      const whole = speedOf(channel({ ...changes, missed: new Set(), doubled: new Set() }), {
        pulsesPerTurn,
      });
      expect(speed.turnTimes).toHaveLength(whole.turnTimes.length);
      for (const [turn, time] of speed.turnTimes.entries())
        expect(Math.abs(time - whole.turnTimes[turn])).toBeLessThan(12);
      expect(Math.abs(speed.meanHz / whole.meanHz - 1)).toBeLessThan(1e-6);
    }
  });

  it('counts the teeth that a wheel lacks as its mark', () => {
    const gaps = new Set(Array.from({ length: 120 }, (_, turn) => [36 * turn + 34, 36 * turn + 35]).flat());
    const speed = speedOf(channel({ pulsesPerTurn: 36, duty: 0.5, missed: gaps }), { pulsesPerTurn: 36 });
    expect(Math.abs(speed.meanHz / 24.37 - 1)).toBeLessThan(1e-4);
    expect(speed.missed).toBeGreaterThan(185);
  });

  it('is not led astray by spikes higher than the pulses', () => {
    const samples = channel({ duty: 0.05 });
    for (const at of [5000, 30_000, 70_000]) samples[at] = 400;
    expect(Math.abs(speedOf(samples).meanHz / 24.37 - 1)).toBeLessThan(1e-4);
  });

  it('takes a threshold of somebody’s own, where two kinds of pulse share a channel', () => {
    // Teeth of 2 V, and once a turn one of 5 V.
    const teeth = channel({ pulsesPerTurn: 8, duty: 0.3, high: 2 });
    const mark = channel({ duty: 0.3 / 8, high: 3 });
    const both = teeth.map((value, n) => value + mark[n]);
    expect(Math.abs(speedOf(both, { threshold: 3.5 }).meanHz / 24.37 - 1)).toBeLessThan(1e-4);
    expect(Math.abs(speedOf(both, { threshold: 1, pulsesPerTurn: 8 }).meanHz / 24.37 - 1)).toBeLessThan(1e-4);
  });

  it('knows the uncertainty of its mean: 95 of 100 recordings with jitter of two samples', () => {
    let inside = 0;
    for (let seed = 1; seed <= 400; seed++) {
      const random = seededRandom(seed);
      // 20 Hz at 2 kHz: a turn takes 100 samples.
      const times = Float64Array.from({ length: 40 }, (_, n) => 30 + 100 * n + 2 * random.gaussian());
      const speed = turnSpeed(
        { times, samples: 4000, refused: null },
        { sampleRateHz: 2000, pulsesPerTurn: 1 },
      );
      if ('refused' in speed) throw new Error(speed.refused);
      if (Math.abs(speed.meanHz - 20) <= speed.uncertaintyHz) inside++;
    }
    expect(inside).toBeGreaterThanOrEqual(368);
    expect(inside).toBeLessThan(400);
  });

  it('does not depend on the size of the blocks', () => {
    const samples = channel({ noise: 0.1 });
    const wanted = speedOf(samples);
    fc.assert(
      fc.property(fc.array(fc.integer({ min: 1, max: 60_000 }), { minLength: 1, maxLength: 8 }), (sizes) => {
        const speed = new PulseSpeed({ sampleRateHz, pulsesPerTurn: 1, threshold: null });
        for (let at = 0, n = 0; at < samples.length; at += sizes[n++ % sizes.length])
          speed.add(samples.subarray(at, at + sizes[n % sizes.length]));
        expect(speed.finish()).toEqual(wanted);
      }),
      { seed: 20261201, numRuns: 10 },
    );
  });

  it('leaves the time out in which a shaft stands, in a long recording', () => {
    const rate = 100_000;
    const noise = gaussianNoise(seededRandom(3), 2 ** 20, 0.01);
    const speed = new PulseSpeed({ sampleRateHz: rate, pulsesPerTurn: 1, threshold: null });
    speed.add(noise);
    speed.add(channel({ sampleRateHz: rate, seconds: 6 }));
    const answer = speed.finish();
    if ('refused' in answer) throw new Error(answer.refused);
    expect(Math.abs(answer.meanHz / 24.37 - 1)).toBeLessThan(1e-4);
    expect(answer.turnTimes[0]).toBeGreaterThan(2 ** 20);
  });
});

describe('a pulse channel that gives no speed', () => {
  it('is refused with a reason', () => {
    expect(refusal(new Float64Array(0))).toContain('does not move');
    expect(refusal(new Float64Array(10_000).fill(2))).toContain('does not move');
    expect(refusal(new Float64Array(10_000).fill(Number.NaN))).toContain('does not move');
    expect(refusal(channel({ seconds: 0.1 }))).toContain('pulse');
    expect(refusal(channel({ pulsesPerTurn: 60, seconds: 0.1 }), { pulsesPerTurn: 60 })).toContain(
      'whole turn',
    );
    expect(refusal(gaussianNoise(seededRandom(4), 100_000))).toMatch(/irregular|missing/);
  });

  it('is refused where a pulse in five is missed', () => {
    const missed = new Set(Array.from({ length: 20 }, (_, n) => 5 * n + ((n * n) % 3)));
    expect(refusal(channel({ missed }))).toMatch(/irregular|missing/);
  });

  it('is refused where two uneven marks are counted as one', () => {
    const one = channel({ duty: 0.05 });
    const late = 300;
    const both = one.map((value, n) => Math.max(value, one[n - late] ?? 0));
    expect(refusal(both)).toMatch(/irregular|too many/);
  });
});
