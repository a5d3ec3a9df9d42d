/** Pools of recordings; P1 to P5 are the rules stated in pooling.ts. */
import fc from 'fast-check';
import { describe, expect, test } from 'vitest';
import { Measurer } from '../../src/manipulation/measure.ts';
import { pooledMeasurement, waitingMeasurement } from '../../src/manipulation/measure-pooled.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';
import { type Pool, type PoolArrival, type PoolRule, poolStep } from '../../src/manipulation/pooling.ts';
import { gaussianNoise, seededRandom } from '../signal/random.ts';
import { testBand, testPoint, testSettings } from './point.ts';

const minuteMs = 60_000;
const rateHz = 5120;

/** Bursts of 512 samples: lines 10 Hz apart. */
function burstPoint(
  changes: Parameters<typeof testPoint>[0] = {},
  analysis: Parameters<typeof testPoint>[1] = {},
) {
  const bands = [testBand('low', 'velocity', 30, 1000), testBand('high', 'acceleration', 1000, 2000)];
  return testPoint(
    { bands, ...changes },
    { segmentSamples: 512, overlapPercent: 0, averageOver: { recordings: 3 }, ...analysis },
  );
}

function measured(samples: Float64Array, point = burstPoint(), sampleRateHz = rateHz): Measurement {
  const measurer = new Measurer(testSettings(point, { sampleRateHz }));
  measurer.add(samples);
  measurer.end({ timeStepDeviation: null });
  return measurer.finish({ speed: null, findings: [] });
}

const noise = (seed: number, count = 512) => gaussianNoise(seededRandom(seed), count);

function arrival(minute: number, change: Partial<PoolArrival> = {}): PoolArrival {
  const measurement = measured(noise(minute + 1));
  return { measurement, usedMs: minute * minuteMs, running: true, condition: '', flagged: false, ...change };
}

const rule: PoolRule = {
  averageOver: { recordings: 3 },
  expectedEveryMs: 2 * minuteMs,
  overdueAfterMs: 10 * minuteMs,
};

/** Plays arrivals; each step in words. */
function play(arrivals: readonly PoolArrival[], by: PoolRule = rule): string[] {
  let open: Pool | null = null;
  return arrivals.map((one) => {
    const step = poolStep(open, one, by);
    open = step.open;
    const words = [
      step.ended === null ? null : `ended with ${step.ended.segments.length}`,
      step.entered ? 'entered' : 'stayed out',
      step.full === null ? null : `full with ${step.full.segments.length}`,
    ];
    return words.filter((word) => word !== null).join(', ');
  });
}

describe('which recordings are pooled', () => {
  test('P3: three recordings fill a pool, and the next begins another', () => {
    expect(play([0, 2, 4, 6, 8, 10, 12].map((minute) => arrival(minute)))).toEqual([
      'entered',
      'entered',
      'entered, full with 3',
      'entered',
      'entered',
      'entered, full with 3',
      'entered',
    ]);
  });

  test('P3: a pool of ten minutes takes what is expected in it, also when one is missing or comes a little late', () => {
    const ten = { ...rule, averageOver: { ms: 10 * minuteMs } };
    const full = (minutes: number[]) =>
      play(
        minutes.map((minute) => arrival(minute)),
        ten,
      );
    expect(full([0, 2, 4, 6, 8, 10])).toEqual([
      ...['entered', 'entered', 'entered', 'entered', 'entered, full with 5'],
      'entered',
    ]);
    expect(full([0, 2, 4, 8.2, 10])).toEqual([
      'entered',
      'entered',
      'entered',
      'entered, full with 4',
      'entered',
    ]);
    expect(full([0, 2, 4, 6, 12])).toEqual([
      ...['entered', 'entered', 'entered', 'entered'],
      'ended with 4, entered',
    ]);
  });

  test('P2: a flagged recording stays out and leaves the pool as it is, whatever its settings', () => {
    const other = measured(noise(50, 1024), burstPoint({}, { segmentSamples: 1024 }));
    expect(
      play([
        arrival(0),
        arrival(2, { flagged: true }),
        arrival(4, { flagged: true, measurement: other }),
        arrival(6, { flagged: true, condition: 'fast' }),
        arrival(8),
        arrival(10),
      ]),
    ).toEqual(['entered', 'stayed out', 'stayed out', 'stayed out', 'entered', 'entered, full with 3']);
  });

  test('P4: a stop, another condition, a silence end a pool as it stands', () => {
    const stop = arrival(4, { running: false, flagged: true, condition: null });
    expect(play([arrival(0), arrival(2), stop, arrival(6)])).toEqual([
      ...['entered', 'entered', 'ended with 2, stayed out', 'entered'],
    ]);
    expect(play([arrival(0), arrival(2, { condition: 'fast' })])).toEqual([
      'entered',
      'ended with 1, entered',
    ]);
    expect(play([arrival(0), arrival(10), arrival(21)])).toEqual([
      'entered',
      'entered',
      'ended with 2, entered',
    ]);
  });

  test('P5: other settings drop a pool, judged by nobody', () => {
    const other = measured(noise(50, 1024), burstPoint({}, { segmentSamples: 1024 }));
    expect(play([arrival(0), arrival(2), arrival(4, { measurement: other })])).toEqual([
      ...['entered', 'entered', 'entered'],
    ]);
    const larger = measured(noise(50), burstPoint({}, { averageOver: { recordings: 4 } }));
    expect(larger.settingsFingerprint).not.toBe(measured(noise(50)).settingsFingerprint);
  });

  test('a rate a hundredth of a percent off lies on the same lines; one off by half a line at the end does not', () => {
    // Within the 0.1 % that counts as the rate configured, but 257 lines of it are more than half a line.
    const wide = { recordings: { ...burstPoint().recordings, sampleRateHz: 5120 } };
    const off = (minute: number, hz: number) =>
      arrival(minute, { measurement: measured(noise(minute), burstPoint(wide), hz) });
    expect(play([off(1, 5120), off(2, 5120.5), off(3, 5119.6)])[2]).toBe('entered, full with 3');
    expect(play([off(1, 5120), off(2, 5120 * 1.0009)])).toEqual(['entered', 'entered']);
    const longer = burstPoint(wide, { segmentSamples: 2048 });
    const long = (minute: number, hz: number) =>
      arrival(minute, { measurement: measured(noise(minute, 2048), longer, hz) });
    expect(play([long(1, 5120), long(2, 5120 * 1.0009)])).toEqual(['entered', 'ended with 1, entered']);
  });

  test('no recording is counted twice, and none that enters is lost, whatever comes', () => {
    const comes = fc.record({
      wait: fc.integer({ min: 1, max: 20 }),
      running: fc.boolean(),
      condition: fc.constantFrom('slow', 'fast'),
      flagged: fc.boolean(),
    });
    const measurement = measured(noise(1));
    fc.assert(
      fc.property(fc.array(comes, { maxLength: 40 }), (all) => {
        let [open, entered, judged, usedMs]: [Pool | null, number, number, number] = [null, 0, 0, 0];
        for (const one of all) {
          usedMs += one.wait * minuteMs;
          const step = poolStep(open, { measurement, usedMs, ...one }, rule);
          entered += step.entered ? 1 : 0;
          judged += (step.ended?.segments.length ?? 0) + (step.full?.segments.length ?? 0);
          open = step.open;
          expect(judged + (open?.segments.length ?? 0)).toBe(entered);
          if (step.entered) expect(one.flagged || !one.running).toBe(false);
        }
      }),
      { seed: 20261201, numRuns: 300 },
    );
  });
});

function pooled(bursts: readonly Float64Array[], point = burstPoint()): Measurement {
  let pool: Pool | null = null;
  const all = bursts.map((samples) => measured(samples, point));
  for (const [n, measurement] of all.entries()) {
    const one = { measurement, usedMs: n * minuteMs, running: true, condition: '', flagged: false };
    pool = poolStep(pool, one, { ...rule, averageOver: { recordings: 1000 } }).open;
  }
  if (pool === null) throw new Error('nothing was pooled');
  return pooledMeasurement(point, all[all.length - 1], pool);
}

describe('what a pool says', () => {
  const bursts = Array.from({ length: 30 }, (_, n) => noise(100 + n));
  const whole = Float64Array.from(bursts.flatMap((burst) => [...burst]));

  test('is what one recording of all bursts says, where segments do not overlap: levels, intervals, peaks', () => {
    for (const burst of bursts)
      for (let n = 0; n < burst.length; n++) burst[n] += Math.sin((2 * Math.PI * 1505 * n) / rateHz);
    const long = Float64Array.from(bursts.flatMap((burst) => [...burst]));
    const together = measured(long);
    const apart = pooled(bursts);
    expect(apart.averaging).toMatchObject({ averages: 30, recordings: 30, segmentSpread: null });
    expect(apart.averaging?.effectiveAverages).toBeCloseTo(30, 10);
    expect(apart.durationS).toBeCloseTo(together.durationS, 12);
    expect(apart.levels.map(({ bandId }) => bandId)).toEqual(['low', 'high']);
    together.levels.forEach((level, n) => {
      const other = apart.levels[n];
      expect(other.fingerprint).toBe(level.fingerprint);
      for (const name of ['level', 'intervalLow', 'intervalHigh'] as const)
        expect(other[name] / level[name]).toBeCloseTo(1, 12);
    });
    expect(apart.peaks.length).toBe(together.peaks.length);
    expect(apart.peaks[0]?.frequencyHz).toBeCloseTo(together.peaks[0]?.frequencyHz ?? 0, 9);
    expect(apart.share).toBeUndefined();
  });

  test('steadies a level: its interval is far narrower than that of one burst', () => {
    const relative = ({ levels: [level] }: Measurement) =>
      (level.intervalHigh - level.intervalLow) / level.level;
    expect(relative(measured(whole.subarray(0, 512))) / relative(pooled(bursts))).toBeGreaterThan(4);
  });

  test('counts overlapped segments of one burst as less than those of different bursts', () => {
    const point = burstPoint({}, { overlapPercent: 75 });
    const longer = Array.from({ length: 10 }, (_, n) => noise(200 + n, 512 + 2 * 128));
    const { averaging } = pooled(longer, point);
    expect(averaging?.averages).toBe(30);
    // Three Hann segments at 75 %: 3 / (1 + 2 (2/3 0.659² + 1/3 0.167²)) = 1.879 each.
    expect(averaging?.effectiveAverages).toBeCloseTo(18.79, 1);
  });

  test('never has a level of a band that begins below three lines: pooling adds averages, not resolution', () => {
    const point = burstPoint({
      bands: [testBand('deep', 'acceleration', 25, 1000), testBand('high', 'acceleration', 1000, 2000)],
    });
    const one = measured(noise(1), point);
    expect(one.levels.map(({ bandId }) => bandId)).toEqual(['high']);
    expect(one.quality).toEqual([
      { flag: 'too-short', detail: expect.stringContaining('begins at 25 Hz, fewer than 3 lines of 10 Hz') },
    ]);
    expect(pooled(bursts, point).levels.map(({ bandId }) => bandId)).toEqual(['high']);
    // Without pooling such a band of accelerations is measured as it always was.
    const { averageOver: _, ...single } = point.analysis;
    expect(measured(noise(1), { ...point, analysis: single }).levels).toHaveLength(2);
  });

  test('the series of a band goes on when its recordings begin to be pooled', () => {
    const { averageOver: _, ...analysis } = burstPoint().analysis;
    const single = measured(noise(1), { ...burstPoint(), analysis });
    expect(pooled(bursts).levels.map(({ fingerprint }) => fingerprint)).toEqual(
      single.levels.map(({ fingerprint }) => fingerprint),
    );
    expect(single.share).toBeUndefined();
  });

  test('a recording that waits keeps its waveform values and says no level', () => {
    const waiting = waitingMeasurement(measured(noise(1)));
    expect(waiting).toMatchObject({ levels: [], peaks: [], spectrum: null, averaging: null });
    expect(waiting.waveform).not.toBeNull();
    expect(waiting.share).toBeUndefined();
  });
});
