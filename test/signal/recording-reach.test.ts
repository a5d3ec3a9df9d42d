import { describe, expect, it } from 'vitest';
import { type ReachQuestion, recordingReach } from '../../src/signal/recording-reach.ts';
import type { RecordingKind } from '../../src/signal/segment-length.ts';

/** 10 s at 25.6 kHz in segments of 16384: a line every 1.5625 Hz. */
const usual: RecordingKind = {
  window: 'hann',
  overlapPercent: 50,
  segmentSamples: 16_384,
  skipStartS: 0,
  sampleRateHz: 25_600,
  durationS: 10,
};
const question: ReachQuestion = {
  confidencePercent: 95,
  bands: [],
  mountingHz: null,
  slowestHz: null,
  envelope: { fromHz: 2000, toHz: 8000 },
};
const reach = (recording: Partial<RecordingKind> = {}, asked: Partial<ReachQuestion> = {}) =>
  recordingReach({ ...usual, ...recording }, { ...question, ...asked });

describe('what a recording can and cannot show', () => {
  it('of 10 s at 25.6 kHz, by hand', () => {
    const can = reach({}, { slowestHz: 24.75 });
    // (256000 - 16384) / 8192 = 29.25 hops.
    expect(can.layout).toMatchObject({ averages: 30, lineSpacingHz: 1.5625 });
    expect(can.highestHz).toBe(10_000);
    expect(can.highestBy).toBe('sample rate');
    expect(can.narrowestBandHz).toBe(3 * 1.5625);
    expect(can.lowestIntegratedHz).toBe(3 * 1.5625);
    expect(can.equalTonesHz).toBe(3 * 1.5625);
    expect(can.unequalTonesHz).toBe(3.5 * 1.5625);
    expect(can.turns).toBeCloseTo(24.75 / 1.5625, 9);
    expect(can.leastNamedHz).toBe(25 * 1.5625);
    expect(can.slowestRepetitionHz).toBe(3 * 1.5625);
    expect(can.fastestRepetitionHz).toBe(1200);
    // K_eff = 30 / (1 + 2 (29/30) / 36) = 28.471 (Welch 1967).
    expect(can.layout.effectiveAverages).toBeCloseTo(28.471, 3);
    expect(can.line?.degreesOfFreedom).toBeCloseTo(56.942, 2);
  });

  it('is bounded by how the sensor is fixed', () => {
    expect(reach({}, { mountingHz: 2000 })).toMatchObject({ highestHz: 2000, highestBy: 'mounting' });
    expect(reach({}, { mountingHz: 2000 }).fastestRepetitionHz).toBeNull();
    expect(reach({}, { mountingHz: 60_000 })).toMatchObject({ highestHz: 10_000, highestBy: 'sample rate' });
  });

  it('of a burst of 0.1 s: no line below 37.5 Hz, no name below 18,750 rpm', () => {
    // 0.1 s at 25.6 kHz is 2560 samples: the largest power of two is 2048, lines 12.5 Hz apart.
    const can = reach({ segmentSamples: 2048, durationS: 0.1 });
    expect(can.layout.averages).toBe(1);
    expect(can.lowestIntegratedHz).toBe(37.5);
    expect(can.leastNamedHz * 60).toBe(18_750);
    // Two degrees of freedom: -5.67 and +15.97 dB (chi-square, any table).
    expect(can.line?.lowDb).toBeCloseTo(-5.67, 2);
    expect(can.line?.highDb).toBeCloseTo(15.97, 2);
  });

  it('says nothing of levels where not one segment fits', () => {
    const can = reach({ durationS: 0.5 }, { bands: [{ fromHz: 10, toHz: 1000, integrations: 0 }] });
    expect(can.layout.averages).toBe(0);
    expect(can.line).toBeNull();
    expect(can.bands).toEqual([{ level: null, hindrance: null }]);
  });

  it('knows a wide band far better than a line, and a velocity less well than the acceleration it is made of', () => {
    const wide = { fromHz: 10, toHz: 1000 };
    const can = reach(
      {},
      {
        bands: [
          { ...wide, integrations: 0 },
          { ...wide, integrations: 1 },
          { fromHz: 100, toHz: 105, integrations: 0 },
          { fromHz: 9000, toHz: 14_000, integrations: 0 },
        ],
      },
    );
    const [acceleration, velocity, narrow, beyond] = can.bands.map(({ level }) => level);
    // 2 B T: 990 Hz for 10 s are 19,800 degrees of freedom, of which half overlapped Hann segments keep 92 %.
    expect((acceleration?.degreesOfFreedom ?? 0) / 19_800).toBeGreaterThan(0.88);
    expect((acceleration?.degreesOfFreedom ?? 0) / 19_800).toBeLessThan(1);
    expect(acceleration?.highDb).toBeLessThan(0.1);
    expect(velocity?.highDb ?? 0).toBeGreaterThan(3 * (acceleration?.highDb ?? 0));
    expect(narrow?.highDb ?? 0).toBeGreaterThan(velocity?.highDb ?? 0);
    expect(narrow?.highDb ?? 0).toBeLessThan(can.line?.highDb ?? 0);
    expect(beyond).toBeNull();
    expect(can.bands.map(({ hindrance }) => hindrance)).toEqual([null, null, null, 'too-high']);
  });

  it('has no band that is narrower, or a velocity that begins lower, than three lines of hann', () => {
    const hindrance = (fromHz: number, toHz: number, integrations: 0 | 1 | 2) =>
      reach({}, { bands: [{ fromHz, toHz, integrations }] }).bands[0]?.hindrance;
    expect(hindrance(100, 100 + 3 * 1.5625, 0)).toBeNull();
    expect(hindrance(100, 104.6, 0)).toBe('too-narrow');
    expect(hindrance(3 * 1.5625, 1000, 1)).toBeNull();
    expect(hindrance(4.6, 1000, 2)).toBe('too-low');
    expect(hindrance(1, 1000, 0)).toBeNull();
    expect(hindrance(10, 10_000, 0)).toBeNull();
    expect(hindrance(10, 10_010, 0)).toBe('too-high');
  });

  it('promises no separation under the rectangular window', () => {
    expect(reach({ window: 'rectangular' }).unequalTonesHz).toBeNull();
  });
});
