/** What a point's measurement is made of: medians to look in, held peaks to look at, straight lines taken off. */
import { describe, expect, test } from 'vitest';
import type { AnalysisSettings } from '../../src/config/site.ts';
import { Measurer } from '../../src/manipulation/measure.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';
import { gaussianNoise, seededRandom } from '../signal/random.ts';
import { testPoint, testSettings } from './point.ts';

const rateHz = 5120;

function measured(
  samples: Float64Array,
  analysis: Partial<AnalysisSettings> = {},
  onDensity?: (density: Float64Array) => void,
): Measurement {
  const measurer = new Measurer(testSettings(testPoint({}, { segmentSamples: 4096, ...analysis }), {}));
  measurer.add(samples);
  measurer.end({ timeStepDeviation: null });
  return measurer.finish({ speed: null, findings: [] }, onDensity);
}

/** Nine segments; a tone at 300 Hz that comes in the second half; a knock in the middle. */
const samples = gaussianNoise(seededRandom(20261201), 4096 * 5).map((value, n) => {
  const tone = n > 4096 * 2.5 ? 0.5 * Math.sin((2 * Math.PI * 300 * n) / rateHz) : 0;
  const knock = n > 10_000 && n < 10_400 ? 12 : 1;
  return knock * value + tone;
});

const numbers = ({ levels }: Measurement) =>
  levels.map(({ level, intervalLow, intervalHigh, fingerprint }) => [
    level,
    intervalLow,
    intervalHigh,
    fingerprint,
  ]);

describe('averages besides the mean', () => {
  test('neither a median nor held peaks move any level or its series', () => {
    const usual = measured(samples);
    // The interval knows of the tones that were found, so it is compared where both find the same.
    expect(numbers(measured(samples, { averaging: 'peak-hold' }))).toEqual(numbers(usual));
    const median = measured(samples, { averaging: 'median' });
    expect(median.levels.map(({ level, fingerprint }) => [level, fingerprint])).toEqual(
      usual.levels.map(({ level, fingerprint }) => [level, fingerprint]),
    );
    expect(new Set([usual, median].map(({ settingsFingerprint }) => settingsFingerprint)).size).toBe(2);
  });

  test('held peaks are what people see: the highest of all segments, marked, never below the mean', () => {
    let shown = new Float64Array();
    const { spectrum } = measured(samples, { averaging: 'peak-hold' }, (density) => {
      shown = density.slice();
    });
    const usual = measured(samples).spectrum;
    expect(spectrum?.averaging).toBe('peak-hold');
    expect(usual?.averaging).toBeUndefined();
    expect(Float32Array.from(shown)).toEqual(spectrum?.density);
    spectrum?.density.forEach((value, line) => {
      expect(value).toBeGreaterThanOrEqual(usual?.density[line] ?? Number.NaN);
    });
  });

  test('in a median fewer peaks are seen where a knock makes maxima of the mean', () => {
    const others = (analysis: Partial<AnalysisSettings>) => {
      let count = 0;
      for (let seed = 1; seed <= 8; seed++) {
        const knocked = gaussianNoise(seededRandom(seed), 4096 * 8).map((value, n) =>
          n > 10_000 && n < 11_500 ? 15 * value : value,
        );
        count += measured(knocked, analysis).peaks.length;
      }
      return count;
    };
    expect(others({})).toBeGreaterThan(12);
    expect(others({ averaging: 'median' })).toBeLessThanOrEqual(4);
  });
});

describe('a straight line taken off each segment', () => {
  const drifting = samples.map((value, n) => value + 0.5 * n);

  test('keeps a drift out of a velocity, whose lowest lines weigh most, and makes a series of its own', () => {
    const [clean, plain, straight] = [
      measured(samples, { detrend: 'linear' }),
      measured(drifting),
      measured(drifting, { detrend: 'linear' }),
    ].map(({ levels }) => levels[0]);
    expect(straight.level / clean.level).toBeCloseTo(1, 8);
    expect(plain.level / clean.level).toBeGreaterThan(1.5);
    expect(straight.fingerprint).not.toBe(plain.fingerprint);
    expect(measured(drifting, { detrend: 'linear' }).averaging?.detrend).toBe('linear');
    expect(measured(drifting).averaging?.detrend).toBeUndefined();
  });
});
