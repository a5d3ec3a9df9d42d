import { expect, it } from 'vitest';
import { seriesFingerprint, seriesRate } from '../../src/manipulation/fingerprint.ts';
import { ratesBeside, seriesBeside } from '../../src/manipulation/series-beside.ts';
import { levelOf } from '../detection/site-parts.ts';
import { testBand, testPoint } from './point.ts';

it('two rates within 0.01 % of one another always know of the rounding of the other', () => {
  for (let rateHz = 1000; rateHz < 200_000; rateHz *= 1.00037) {
    const other = rateHz * 1.0001;
    const names = (hz: number) => [seriesRate(hz, null), ...ratesBeside(hz, null)];
    expect(names(rateHz), `${rateHz}`).toContain(seriesRate(other, null));
    expect(names(other), `${rateHz}`).toContain(seriesRate(rateHz, null));
  }
});

it('only roundings within 0.1 % of the rate are beside it, and none beside a configured rate that is kept', () => {
  expect(ratesBeside(16_385.2, null)).toEqual([16_380, 16_400]);
  expect(ratesBeside(1001.3, null)).toEqual([1002]);
  expect(ratesBeside(25_610, 25_600)).toEqual([]);
  // 0.104 % off, and a rounding away from a rate that would pass for the configured one.
  expect(ratesBeside(25_626.6, 25_600)).toEqual([25_640]);
  expect(ratesBeside(0, null)).toEqual([]);
});

it('a level knows the name that its series has at the neighbouring rate', () => {
  const point = testPoint({ recordings: { ...testPoint().recordings, sampleRateHz: null } });
  const band = testBand('overall', 'velocity', 10, 1000);
  const at = (sampleRateHz: number) => ({
    point,
    signal: point.signal,
    sampleRateHz,
    segmentSamples: 16_384,
  });
  const own = seriesFingerprint(at(16_386), band);
  const levels = [levelOf(1, { bandId: 'overall', fingerprint: own }), levelOf(1, { bandId: 'foreign' })];
  const [beside] = seriesBeside(at(16_386), [band], levels);
  expect(own).not.toBe(seriesFingerprint(at(16_384), band));
  expect(beside?.fingerprints).toEqual({ [own]: seriesFingerprint(at(16_384), band) });
});
