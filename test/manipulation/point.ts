import type { AnalysisSettings, Band, Point, Quantity } from '../../src/config/site.ts';
import { displayUnit, siUnit } from '../../src/config/units.ts';
import type { MeasureSettings } from '../../src/manipulation/measure.ts';

/** A point of an invented machine, as the site file's reader would give it. */
export function testPoint(changes: Partial<Point> = {}, analysis: Partial<AnalysisSettings> = {}): Point {
  return {
    machineId: 'blower-1',
    id: 'de-h',
    name: 'drive end, horizontal',
    formerly: [],
    direction: 'horizontal',
    mounting: 'stud',
    channel: 1,
    quantity: 'acceleration',
    signal: { samplesIn: siUnit('acceleration'), fullScale: null, sensitivity: null, sensitivityText: null },
    recordings: {
      files: '<machine>_<any>.wav',
      filesRegex: null,
      startInName: null,
      clock: { kind: 'utc' },
      ignore: [],
      sampleRateHz: null,
      durationS: null,
      expectedEveryMs: 3_600_000,
      overdueAfterMs: 7_200_000,
      settleMs: 5000,
      sidecar: 'none',
    },
    bands: [testBand('overall', 'velocity', 10, 1000), testBand('bearing', 'acceleration', 1000, 2000)],
    limits: [],
    ...changes,
    analysis: {
      window: 'hann',
      overlapPercent: 50,
      lineSpacingHz: 1.6,
      segmentSamples: null,
      skipStartS: 0,
      confidencePercent: 95,
      falsePeaksPerSpectrum: 0.1,
      ...analysis,
    },
  };
}

export function testBand(id: string, quantity: Quantity, from: number, to: number, inOrders = false): Band {
  return { id, formerly: [], quantity, from, to, inOrders, display: displayUnit(siUnit(quantity), 'rms') };
}

export function testSettings(point: Point, changes: Partial<MeasureSettings> = {}): MeasureSettings {
  return {
    point,
    channel: '1',
    sampleRateHz: 5120,
    siPerSample: 1,
    signal: point.signal,
    sidecar: null,
    check: null,
    ...changes,
  };
}

/** Sum of sines: amplitude, frequency in Hz, phase. */
export function sines(
  seconds: number,
  sampleRateHz: number,
  parts: readonly (readonly [number, number, number])[],
): Float64Array {
  return Float64Array.from({ length: Math.round(seconds * sampleRateHz) }, (_, n) =>
    parts.reduce(
      (sum, [amplitude, hz, phase]) =>
        sum + amplitude * Math.sin((2 * Math.PI * hz * n) / sampleRateHz + phase),
      0,
    ),
  );
}
