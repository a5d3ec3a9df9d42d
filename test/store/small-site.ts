import { createHash } from 'node:crypto';
import type { Band, Limit, Machine, Point, Site } from '../../src/config/site.ts';
import { usualSpeed } from '../../src/config/speed-settings.ts';
import type { Measurement } from '../../src/manipulation/measurement.ts';

/** `id` or `id<former` or `id<former,older`. */
function named(text: string): { readonly id: string; readonly formerly: readonly string[] } {
  const [id = '', formerly] = text.split('<');
  return { id, formerly: formerly === undefined ? [] : formerly.split(',') };
}

function band(text: string): Band {
  return {
    ...named(text),
    quantity: 'velocity',
    from: 10,
    to: 1000,
    inOrders: false,
    display: { text: 'mm/s', quantity: 'velocity', inSi: 0.001, detector: 'rms' },
  };
}

function limit(text: string, bandId: string): Limit {
  return {
    ...named(text),
    bandId,
    kind: 'fixed',
    side: 'upper',
    alert: 0.0028,
    danger: 0.0045,
    onDelay: { recordings: 1 },
    offDelay: { recordings: 1 },
    deadbandPercent: 10,
    latching: false,
    sayAgainPercent: null,
    action: null,
    respondWithinMs: null,
  };
}

/** One limit `<band>-upper` a band; a band written `id<former` has a limit carried over likewise. */
function point(machineId: string, text: string, bands: readonly string[]): Point {
  return {
    machineId,
    ...named(text),
    name: text,
    direction: null,
    mounting: null,
    channel: 1,
    quantity: 'acceleration',
    signal: {
      samplesIn: { text: 'm/s2', quantity: 'acceleration', inSi: 1 },
      fullScale: null,
      sensitivity: null,
      sensitivityText: null,
    },
    recordings: {
      files: null,
      filesRegex: null,
      startInName: null,
      clock: { kind: 'utc' },
      ignore: [],
      sampleRateHz: 25600,
      durationS: 10,
      expectedEveryMs: 3_600_000,
      overdueAfterMs: 7_200_000,
      settleMs: 5000,
      sidecar: 'none',
    },
    analysis: {
      window: 'hann',
      overlapPercent: 50,
      lineSpacingHz: 1.6,
      segmentSamples: null,
      skipStartS: 0,
      confidencePercent: 95,
      falsePeaksPerSpectrum: 0.01,
    },
    bands: bands.map(band),
    limits: bands.map((name) => {
      const { id, formerly } = named(name);
      const former = formerly.map((old) => `${old}-upper`).join(',');
      return limit(former === '' ? `${id}-upper` : `${id}-upper<${former}`, id);
    }),
  };
}

/** machine -> point -> bands, each name as `id` or `id<former`. */
export type Tree = Readonly<Record<string, Readonly<Record<string, readonly string[]>>>>;

export function smallSite(tree: Tree): { readonly site: Site; readonly text: string } {
  const text = JSON.stringify(tree);
  const machines = Object.entries(tree).map(
    ([machine, points]): Machine => ({
      ...named(machine),
      name: machine,
      area: null,
      type: null,
      runningSpeedHz: null,
      running: null,
      afterStartMs: 0,
      speed: usualSpeed,
      stoppedExpectedMs: 0,
      criticality: 'B',
      like: [],
      points: Object.entries(points).map(([name, bands]) => point(named(machine).id, name, bands)),
    }),
  );
  return {
    text,
    site: {
      name: 'Larkfen Waterworks',
      timeZone: 'Europe/Dublin',
      file: '/site.yaml',
      configVersion: createHash('sha256').update(text).digest('hex'),
      folders: { drop: '/drop', data: '/data', afterReading: 'archive' },
      machines,
      mail: null,
      summary: null,
      page: null,
      timings: {
        incompleteAfterMs: 600_000,
        unassignedAfterMs: 604_800_000,
        clockToleranceMs: 300_000,
        backlogQuietMs: 60_000,
        backlogWaitMs: 900_000,
        sweepEveryMs: 300_000,
        polling: false,
      },
      largestFileBytes: 2 ** 31,
      warnings: [],
    },
  };
}

export function measurementOf(
  machineId: string,
  pointId: string,
  levels: Readonly<Record<string, number>>,
  more: Partial<Measurement> = {},
): Measurement {
  return {
    machineId,
    pointId,
    channel: '1',
    quantity: 'acceleration',
    unit: 'm/s²',
    sampleRateHz: 25600,
    durationS: 10,
    speed: {
      rpm: 2970,
      origin: 'nominal',
      uncertaintyRpm: 60,
      usableForNames: true,
      rangeRpm: null,
      inSpectrum: null,
    },
    loadPercent: null,
    runningSaid: null,
    waveform: { mean: 0, rms: 1, peak: 4, crestFactor: 4, kurtosis: 3, skewness: 0 },
    averaging: {
      window: 'hann',
      overlapPercent: 50,
      segmentSamples: 16000,
      lineSpacingHz: 1.6,
      averages: 31,
      effectiveAverages: 29.3,
      usedPercent: 100,
      segmentSpread: null,
    },
    levels: Object.entries(levels).map(([bandId, level]) => ({
      bandId,
      fingerprint: 'settings-1',
      fromHz: 10,
      toHz: 1000,
      quantity: 'velocity',
      level,
      intervalLow: level * 0.9,
      intervalHigh: level * 1.1,
      confidencePercent: 95,
      exceededBy80Percent: level * 0.95,
      atLeast: false,
    })),
    peaks: [],
    evidence: [],
    spectrum: null,
    quality: [],
    settingsFingerprint: 'all-1',
    ...more,
  };
}
