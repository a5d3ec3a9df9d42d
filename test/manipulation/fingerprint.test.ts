import { describe, expect, it } from 'vitest';
import type { AnalysisSettings, Band, Point } from '../../src/config/site.ts';
import { displayUnit, siUnit } from '../../src/config/units.ts';
import {
  isWrongRate,
  seriesFingerprint,
  seriesRate,
  settingsFingerprint,
} from '../../src/manipulation/fingerprint.ts';
import { testBand, testPoint } from './point.ts';

const band = testBand('overall', 'velocity', 10, 1000);

interface Changes {
  readonly point?: Partial<Point>;
  readonly analysis?: Partial<AnalysisSettings>;
  readonly band?: Partial<Band>;
  readonly sampleRateHz?: number;
  readonly segmentSamples?: number;
}

function print({
  point,
  analysis,
  band: other,
  sampleRateHz = 25_600,
  segmentSamples = 16_384,
}: Changes = {}): string {
  const made = testPoint(point, analysis);
  return seriesFingerprint(
    { point: made, signal: made.signal, sampleRateHz, segmentSamples },
    { ...band, ...other },
  );
}

const signal = testPoint().signal;
const recordings = testPoint().recordings;

describe('the fingerprint of a series', () => {
  it.each<[string, Changes]>([
    ['window', { analysis: { window: 'flat-top' } }],
    ['segment', { segmentSamples: 8192 }],
    ['overlap', { analysis: { overlapPercent: 75 } }],
    ['skipped start', { analysis: { skipStartS: 1 } }],
    ['lower edge', { band: { from: 5 } }],
    ['upper edge', { band: { to: 2000 } }],
    ['orders', { band: { inOrders: true } }],
    ['integration', { band: { quantity: 'displacement' } }],
    ['measured quantity', { point: { quantity: 'velocity' } }],
    ['sensitivity', { point: { signal: { ...signal, sensitivity: 0.0102 } } }],
    ['full scale', { point: { signal: { ...signal, fullScale: 10 } } }],
    [
      'unit of the samples',
      { point: { signal: { ...signal, samplesIn: { text: 'g', quantity: 'acceleration', inSi: 9.80665 } } } },
    ],
    ['sample rate', { sampleRateHz: 51_200 }],
  ])('is moved by the %s', (_, changes) => {
    expect(print(changes)).not.toBe(print());
  });

  it.each<[string, Changes]>([
    ['the line spacing that leads to the same segment', { analysis: { lineSpacingHz: 1.7 } }],
    ['the confidence of its interval', { analysis: { confidencePercent: 90 } }],
    ['names', { point: { id: 'other', machineId: 'other', name: 'other', direction: null, mounting: null } }],
    ['the band’s name', { band: { id: 'other', formerly: ['overall'] } }],
    ['the unit in which people see it', { band: { display: displayUnit(siUnit('velocity'), 'peak') } }],
    ['other bands and limits', { point: { bands: [], limits: [] } }],
    [
      'length and interval of recordings',
      { point: { recordings: { ...recordings, durationS: 5, expectedEveryMs: 1 } } },
    ],
    ['how the sensitivity was written', { point: { signal: { ...signal, sensitivityText: '100 mV/g' } } }],
    ['a rate a little off', { sampleRateHz: 25_601 }],
  ])('is not moved by %s', (_, changes) => {
    expect(print(changes)).toBe(print());
  });

  it('takes the configured rate where the recording keeps to it within 0.1 %', () => {
    expect(seriesRate(25_610, 25_600)).toBe(25_600);
    expect(seriesRate(25_700, 25_600)).toBe(25_700);
    expect(isWrongRate(25_625, 25_600)).toBe(false);
    expect(isWrongRate(25_627, 25_600)).toBe(true);
    expect(isWrongRate(25_574, 25_600)).toBe(true);
    expect(isWrongRate(12_800, null)).toBe(false);
  });

  it('of the whole point moves with any of its bands and with the search for peaks', () => {
    const whole = (changes: Partial<Point>, analysis: Partial<AnalysisSettings> = {}) => {
      const point = testPoint(changes, analysis);
      return settingsFingerprint(
        { point, signal: point.signal, sampleRateHz: 25_600, segmentSamples: 16_384 },
        point.bands,
      );
    };
    const usual = whole({});
    expect(whole({})).toBe(usual);
    expect(whole({ limits: [], name: 'other' })).toBe(usual);
    expect(whole({ bands: [band] })).not.toBe(usual);
    expect(whole({}, { falsePeaksPerSpectrum: 0.5 })).not.toBe(usual);
  });
});
