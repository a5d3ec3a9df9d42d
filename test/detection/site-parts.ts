import type { QualityFlag } from '../../src/acquisition/recording.ts';
import type { Limit, Machine, Point } from '../../src/config/site.ts';
import { usualSpeed } from '../../src/config/speed-settings.ts';
import type { AlarmChange, AlarmState } from '../../src/detection/alarm.ts';
import { subjectKey } from '../../src/detection/alarm.ts';
import type { BandLevel, Measurement } from '../../src/manipulation/measurement.ts';

/** Parts of a site, complete and plain, for tests that need no site file; each takes what the test is about. */
export const hourMs = 3_600_000;
export const minuteMs = 60_000;

const velocity = { text: 'mm/s', quantity: 'velocity', inSi: 1e-3, detector: 'rms' } as const;

export function limitWith(parts: Partial<Limit> = {}): Limit {
  return {
    id: 'overall-fixed-upper',
    formerly: [],
    bandId: 'overall',
    kind: 'fixed',
    side: 'upper',
    alert: 2.8,
    danger: 4.5,
    onDelay: { recordings: 2 },
    offDelay: { recordings: 1 },
    deadbandPercent: 10,
    latching: false,
    sayAgainPercent: null,
    action: null,
    respondWithinMs: null,
    ...parts,
  };
}

export function pointWith(parts: Partial<Point> = {}, recordings: Partial<Point['recordings']> = {}): Point {
  return {
    machineId: 'blower-1',
    id: 'de-h',
    name: 'drive end, horizontal',
    formerly: [],
    direction: 'horizontal',
    mounting: 'stud',
    channel: 1,
    quantity: 'acceleration',
    signal: {
      samplesIn: { text: 'V', quantity: 'voltage', inSi: 1 },
      fullScale: 10,
      sensitivity: 0.0102,
      sensitivityText: '100 mV/g',
    },
    recordings: {
      files: '<machine>_<any>.wav',
      filesRegex: null,
      startInName: null,
      clock: { kind: 'utc' },
      ignore: [],
      sampleRateHz: 25_600,
      durationS: 10,
      expectedEveryMs: hourMs,
      overdueAfterMs: 2 * hourMs,
      settleMs: 5_000,
      sidecar: 'optional',
      ...recordings,
    },
    analysis: {
      window: 'hann',
      overlapPercent: 50,
      lineSpacingHz: 1.6,
      segmentSamples: null,
      skipStartS: 0,
      confidencePercent: 95,
      falsePeaksPerSpectrum: 0.1,
    },
    bands: [
      {
        id: 'overall',
        formerly: [],
        quantity: 'velocity',
        from: 10,
        to: 1000,
        inOrders: false,
        display: velocity,
      },
    ],
    limits: [limitWith()],
    ...parts,
  };
}

export function machineWith(parts: Partial<Machine> = {}): Machine {
  return {
    id: 'blower-1',
    name: 'Aeration blower 1',
    area: null,
    type: null,
    formerly: [],
    runningSpeedHz: 49.5,
    running: null,
    afterStartMs: 10 * minuteMs,
    speed: usualSpeed,
    stoppedExpectedMs: 7 * 24 * hourMs,
    criticality: 'A',
    like: [],
    points: [pointWith(), pointWith({ id: 'nde-h', name: 'non-drive end, horizontal', channel: 2 })],
    ...parts,
  };
}

/** Levels here are plain numbers near the limits 2.8 and 4.5; detection does not care for units. */
export function levelOf(level: number, parts: Partial<BandLevel> = {}): BandLevel {
  return {
    bandId: 'overall',
    fingerprint: 'f',
    fromHz: 10,
    toHz: 1000,
    quantity: 'velocity',
    level,
    intervalLow: level * 0.9,
    intervalHigh: level * 1.1,
    confidencePercent: 95,
    exceededBy80Percent: null,
    atLeast: false,
    ...parts,
  };
}

export interface MeasurementParts extends Partial<Omit<Measurement, 'quality' | 'levels' | 'averaging'>> {
  readonly levels?: readonly BandLevel[];
  readonly flags?: readonly QualityFlag[];
  readonly averages?: number;
}

export function measurementWith({ levels = [], flags = [], averages = 31, ...parts }: MeasurementParts = {}) {
  const measurement: Measurement = {
    machineId: 'blower-1',
    pointId: 'de-h',
    channel: '1',
    quantity: 'acceleration',
    unit: 'm/s²',
    sampleRateHz: 25_600,
    durationS: 10,
    speed: null,
    loadPercent: null,
    runningSaid: null,
    waveform: { mean: 0, rms: 1, peak: 4, crestFactor: 4, kurtosis: 3, skewness: 0 },
    averaging: {
      window: 'hann',
      overlapPercent: 50,
      segmentSamples: 16_384,
      lineSpacingHz: 1.5625,
      averages,
      effectiveAverages: averages * 0.9,
      usedPercent: 99,
      segmentSpread: 0.3,
    },
    levels,
    peaks: [],
    evidence: [],
    spectrum: null,
    quality: flags.map((flag) => ({ flag, detail: `flagged ${flag}` })),
    settingsFingerprint: 's',
    ...parts,
  };
  return measurement;
}

/** What the ledger does with changes: keeps the newest state of each subject. */
export class AlarmBook {
  readonly states = new Map<string, AlarmState>();

  take(changes: readonly AlarmChange[]): readonly AlarmChange[] {
    for (const change of changes) this.states.set(subjectKey(change.subject), change.state);
    return changes;
  }
}
