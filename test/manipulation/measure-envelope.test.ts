import { describe, expect, it } from 'vitest';
import type { PointEnvelope } from '../../src/config/envelope-settings.ts';
import type { Band, Point } from '../../src/config/site.ts';
import { envelopePlan, searchSettings } from '../../src/manipulation/envelope-plan.ts';
import { Measurer, type MeasureSettings } from '../../src/manipulation/measure.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';
import { runningSpeed } from '../../src/manipulation/running-speed.ts';
import { hiddenImpacts } from '../signal/hidden-impacts.ts';
import { gaussianNoise, seededRandom } from '../signal/random.ts';
import { testBand, testPoint, testSettings } from './point.ts';

const sampleRateHz = 25_600;
const usual: PointEnvelope = { band: null, choose: 'fixed', lineSpacingHz: 1.6, highestHz: 400 };
const ofEnvelope = (id: string, from: number, to: number, inOrders = false): Band => ({
  ...testBand(id, 'acceleration', from, to, inOrders),
  of: 'envelope',
});
const bands = [testBand('overall', 'velocity', 10, 1000), ofEnvelope('shocks', 20, 400)];

function pointWith(envelope: Partial<PointEnvelope> = {}, changes: Partial<Point> = {}): Point {
  return testPoint({ bands, envelope: { ...usual, ...envelope }, ...changes });
}

function measure(
  samples: Float64Array,
  point: Point,
  changes: Partial<MeasureSettings> = {},
  rpm = 3000,
): Measurement {
  const measurer = new Measurer(testSettings(point, { sampleRateHz, ...changes }));
  for (let at = 0; at < samples.length; at += 10_000) measurer.add(samples.subarray(at, at + 10_000));
  measurer.end({ timeStepDeviation: null });
  return measurer.finish(runningSpeed({ sidecarRpm: rpm, nominalHz: null }));
}

/** 4 (1 + 0.3 cos 2 pi 120 t) cos 2 pi 5000 t beside a shaft line. */
const modulated = Float64Array.from({ length: 256_000 }, (_, n) => {
  const t = (2 * Math.PI * n) / sampleRateHz;
  return 4 * (1 + 0.3 * Math.cos(120 * t)) * Math.cos(5000 * t) + 10 * Math.cos(50 * t);
});
const levelOf = ({ levels }: Measurement, id: string) => levels.find(({ bandId }) => bandId === id);

describe('a band of the envelope', () => {
  const measurement = measure(modulated, pointWith());

  it('has the level of the modulation, in order among the other bands, with an interval', () => {
    expect(measurement.levels.map(({ bandId }) => bandId)).toEqual(['overall', 'shocks']);
    const shocks = levelOf(measurement, 'shocks');
    expect(shocks?.level).toBeCloseTo((4 * 0.3) / Math.SQRT2, 4);
    expect(shocks?.intervalLow).toBeLessThan(shocks?.level as number);
    expect(shocks?.exceededBy80Percent).toBeCloseTo((4 * 0.3) / Math.SQRT2, 2);
    expect(shocks).toMatchObject({ fromHz: 20, toHz: 400, quantity: 'acceleration', confidencePercent: 95 });
  });

  it('comes with the envelope: its band, its averaging, its peaks with their orders', () => {
    const { envelope } = measurement;
    expect(envelope).toMatchObject({ fromHz: 2000, toHz: 8000, chosen: 'fixed', candidate: null });
    expect(envelope?.averaging).toMatchObject({ segmentSamples: 4096, lineSpacingHz: 1.5625, averages: 30 });
    expect(envelope?.peaks[0].frequencyHz).toBeCloseTo(120, 3);
    expect(envelope?.peaks[0].order).toBeCloseTo(2.4, 4);
    // Half of 6 kHz in lines of 1.5625 Hz.
    expect(envelope?.spectrum.density.length).toBe(1921);
  });

  it('leaves the other bands and their series as they are', () => {
    const plain = measure(modulated, testPoint({ bands: [bands[0]] }));
    expect(levelOf(measurement, 'overall')).toEqual(levelOf(plain, 'overall'));
    expect(plain.envelope).toBeNull();
    expect(measurement.peaks).toEqual(plain.peaks);
  });

  it('follows the running speed where it is in orders', () => {
    const point = pointWith({}, { bands: [ofEnvelope('shocks', 2, 3, true)] });
    expect(levelOf(measure(modulated, point), 'shocks')).toMatchObject({ fromHz: 100, toHz: 150 });
    // 3x is 3150 Hz then, and the envelope ends at 3 kHz.
    const fast = measure(modulated, point, {}, 63_000);
    expect(fast.levels).toEqual([]);
    expect(fast.quality.map(({ flag }) => flag)).toContain('wrong-rate');
  });
});

describe('the series of a band of the envelope', () => {
  const series = (point: Point, changes: Partial<MeasureSettings> = {}) =>
    measure(modulated, point, changes).levels.map(({ fingerprint }) => fingerprint);
  const [overall, shocks] = series(pointWith());

  it('ends with the band that is demodulated, the plain ones go on', () => {
    const other = series(pointWith({ band: { fromHz: 3000, toHz: 6000 } }));
    expect(other[0]).toBe(overall);
    expect(other[1]).not.toBe(shocks);
    expect(series(pointWith({ choose: 'kurtosis' }))).toEqual([overall, shocks]);
    const chosen = series(pointWith({ choose: 'kurtosis' }), { chosenBand: { fromHz: 4000, toHz: 6000 } });
    expect(chosen[0]).toBe(overall);
    expect(chosen[1]).not.toBe(shocks);
  });

  it('ends with the line spacing of the envelope, not with that of the plain spectrum', () => {
    expect(series(pointWith({ lineSpacingHz: 0.8 }))[1]).not.toBe(shocks);
    const finer = testPoint({ bands, envelope: usual }, { lineSpacingHz: 0.8 });
    expect(series(finer)[0]).not.toBe(overall);
    expect(series(finer)[1]).toBe(shocks);
  });

  it('goes on at a rate that counts as the same', () => {
    const recordings = { ...testPoint().recordings, sampleRateHz };
    const usualRate = pointWith({}, { recordings });
    expect(series(usualRate, { sampleRateHz: 25_601 })).toEqual(series(usualRate));
  });
});

describe('a recording that gives no envelope', () => {
  it('says why: too short', () => {
    const { envelope, quality, levels } = measure(modulated.subarray(0, 16_384), pointWith());
    expect(envelope).toBeNull();
    expect(levels.map(({ bandId }) => bandId)).toEqual(['overall']);
    expect(quality).toContainEqual({
      flag: 'too-short',
      detail: 'no level of band shocks: the recording is too short for the envelope; record longer',
    });
  });

  it('says why: its rate is too low for the band of the site file', () => {
    const point = pointWith({ band: { fromHz: 3000, toHz: 6000 } });
    const { envelope, quality } = measure(modulated, point, { sampleRateHz: 5120 });
    expect(envelope).toBeNull();
    expect(quality.map(({ detail }) => detail)).toContainEqual(
      "no level of band shocks: the recording's sample rate is too low for the envelope",
    );
  });
});

describe('choice by kurtosis', () => {
  const impacts = hiddenImpacts(seededRandom(2), {
    sampleRateHz,
    durationS: 10,
    impactsPerS: 80,
    resonanceHz: 5200,
    halfWidthHz: 150,
    aboveNoiseDb: -10,
    slip: 0.01,
  });

  it('offers the band in which shocks stand out, and measures by the fixed one meanwhile', () => {
    const { envelope } = measure(impacts, pointWith({ choose: 'kurtosis' }));
    expect(envelope).toMatchObject({ fromHz: 2000, toHz: 8000, chosen: 'fixed' });
    expect(envelope?.candidate?.passes).toBe(true);
    expect(envelope?.candidate?.fromHz).toBeLessThan(5200);
    expect(envelope?.candidate?.toHz).toBeGreaterThan(5200);
  });

  it('offers nothing that passes in noise', () => {
    const noise = gaussianNoise(seededRandom(2), 256_000);
    expect(measure(noise, pointWith({ choose: 'kurtosis' })).envelope?.candidate?.passes).toBe(false);
  });

  it('measures by the band that was chosen, and looks no further', () => {
    const chosenBand = { fromHz: 4800, toHz: 6400 };
    const { envelope } = measure(impacts, pointWith({ choose: 'kurtosis' }), { chosenBand });
    expect(envelope).toMatchObject({ ...chosenBand, chosen: 'kurtosis', candidate: null });
    expect(envelope?.peaks.some(({ frequencyHz }) => Math.abs(frequencyHz - 80) < 1.5)).toBe(true);
  });

  it('heeds no choice where the site file fixes the band, and none that the rate does not reach', () => {
    const chosen = { fromHz: 9000, toHz: 12_000 };
    expect(envelopePlan(pointWith(), sampleRateHz, chosen)).toMatchObject({ chosen: 'fixed', search: null });
    const slow = envelopePlan(pointWith({ choose: 'kurtosis' }), 12_800, chosen);
    expect(slow).toMatchObject({ chosen: 'fixed', band: { fromHz: 1250, toHz: 5000 } });
  });

  it('looks only where the sensor serves, for bands wide enough for what the site file names', () => {
    const envelope: PointEnvelope = { ...usual, choose: 'kurtosis', highestHz: 700 };
    expect(searchSettings(envelope, sampleRateHz, 'stud')).toEqual({
      sampleRateHz,
      lowestHz: 500,
      highestHz: 10_000,
      narrowestHz: 1400,
    });
    const heard: PointEnvelope = { ...envelope, faultsToHz: 1000 };
    expect(searchSettings(heard, sampleRateHz, 'stud').narrowestHz).toBe(2000);
    expect(searchSettings(usual, sampleRateHz, 'magnet')).toMatchObject({
      lowestHz: 125,
      highestHz: 2000,
      narrowestHz: 800,
    });
  });
});

it('a gap ends a stretch: the envelope is that of the longest', () => {
  const broken = modulated.slice();
  broken[200_000] = Number.NaN;
  const { envelope, durationS } = measure(broken, pointWith());
  expect(durationS).toBeCloseTo(200_000 / sampleRateHz, 6);
  expect(envelope?.averaging.averages).toBe(23);
  expect(envelope?.peaks[0].frequencyHz).toBeCloseTo(120, 3);
});
