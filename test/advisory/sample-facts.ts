import type {
  AlarmFacts,
  AlarmMailFacts,
  BandFacts,
  LevelFacts,
  LimitFacts,
  MachineFacts,
  PointFacts,
  TroubleFacts,
  ZoneFacts,
} from '../../src/advisory/facts.ts';
import type { RepairFacts } from '../../src/advisory/repair-words.ts';
import type { BandNow, PointNow, SummaryFacts } from '../../src/advisory/summary-facts.ts';
import type { TrendFacts } from '../../src/advisory/trend-words.ts';
import { displayUnit, usualDisplayUnit } from '../../src/config/units.ts';

/** An invented site on an invented morning, as facts. */
export const hour = 3_600_000;
export const day = 24 * hour;
/** Tue 1 Dec 2026, 06:30 in Dublin. */
export const morning = Date.UTC(2026, 11, 1, 6, 30);

export const site = { name: 'Larkfen Waterworks', timeZone: 'Europe/Dublin' };
export const blower: MachineFacts = { id: 'blower-1', name: 'Aeration blower 1', criticality: 'A' };
export const pump: MachineFacts = { id: 'pump-2', name: 'Sludge pump 2', criticality: 'B' };
export const fan: MachineFacts = { id: 'fan-3', name: 'Vent fan 3', criticality: 'C' };

const place = (id: string, end: string, direction: string): PointFacts => ({
  id,
  name: `${end}, ${direction}`,
  direction,
});
export const driveH = place('de-h', 'drive end', 'horizontal');
export const driveV = place('de-v', 'drive end', 'vertical');
export const otherH = place('nde-h', 'non-drive end', 'horizontal');

const mmPerS = usualDisplayUnit('velocity');
const mPerS2 = usualDisplayUnit('acceleration');
export const overall: BandFacts = { id: 'overall', fromHz: 10, toHz: 1000, display: mmPerS };
export const bearing: BandFacts = { id: 'bearing', fromHz: 2000, toHz: 8000, display: mPerS2 };
export const shaft: BandFacts = {
  id: 'shaft',
  fromHz: 5,
  toHz: 200,
  display: displayUnit({ text: 'µm', quantity: 'displacement', inSi: 1e-6 }, 'peak-to-peak', true),
};
export const overallLimit: LimitFacts = {
  id: 'overall-fixed-upper',
  side: 'upper',
  alert: 2.8e-3,
  danger: 4.5e-3,
};
export const bearingLimit: LimitFacts = {
  id: 'bearing-fixed-upper',
  side: 'upper',
  alert: 12,
  danger: null,
};

/** The same machine with its limits from the zones of group 2, rigid. */
export const zoneLimit: LimitFacts = {
  id: 'overall-zone-upper',
  side: 'upper',
  alert: 2.5e-3,
  danger: 4.5e-3,
  reasons: {
    alert: 'baseline 1.8 mm/s + 25 % of B/C (2.8 mm/s) of ISO 20816-3 (group 2, rigid)',
    danger: 'C/D of ISO 20816-3 (group 2, rigid)',
  },
};

/** Of ISO 20816-3, group 2, rigid. */
export function zoneOf(letter: ZoneFacts['letter'], parts: Partial<ZoneFacts> = {}): ZoneFacts {
  return {
    letter,
    why: null,
    atLeast: false,
    table: 'ISO 20816-3 (group 2, rigid)',
    boundaries: letter === null ? null : { ab: 1.4e-3, bc: 2.8e-3, cd: 4.5e-3 },
    change: null,
    machine: null,
    ...parts,
  };
}

export function levelOf(level: number, usedMs = morning - hour / 2, atLeast = false): LevelFacts {
  return {
    usedMs,
    level,
    intervalLow: level * 0.955,
    intervalHigh: level * 1.048,
    confidencePercent: 95,
    atLeast,
  };
}

/** A level that has grown for a month and would go on to its danger limit. */
export const rising: TrendFacts = {
  trend: {
    kind: 'rising',
    days: 30,
    fromMs: morning - 30.5 * day,
    toMs: morning - 0.5 * day,
    p: 2.1e-7,
    growth: 1.64,
    growthPerDay: 1.017,
    growthPerDayLow: 1.012,
    growthPerDayHigh: 1.022,
    levelNow: 3.1e-3,
    confidencePercent: 90,
    line: { x: 360, y: -6.03, slope: 7e-4, yVariance: 4e-4, slopeVariance: 1e-8 },
    runningHoursNow: 720,
  },
  time: 'running',
  condition: '',
  broken: null,
  ahead: {
    limit: 'overall-fixed-upper',
    severity: 'danger',
    at: 4.5e-3,
    time: { days: 9.2, earliestDays: 6.1, latestDays: 15.6, confidencePercent: 90 },
  },
};

const unacknowledged = {
  standing: 'unacknowledged',
  respondByMs: null,
  acknowledgedBy: null,
  acknowledgedMs: null,
  suppressedUntilMs: null,
} as const;

export const danger: AlarmFacts = {
  kind: 'alarm',
  number: 17,
  ...unacknowledged,
  severity: 'danger',
  machine: blower,
  point: driveH,
  band: overall,
  limit: overallLimit,
  level: levelOf(5.21e-3),
  dangerUnconfirmed: false,
  evidence: [
    {
      grade: 'clear',
      words:
        'three harmonics of BPFO of the drive-end bearing in the envelope (176.9 Hz), 14 dB over the floor, sidebands at 1x',
    },
  ],
  change: { ratio: 1.74, ordinaryRatio: 1.13, worse: true },
  action: 'Check base bolts and coupling, look for build-up on the impeller',
  respondByMs: morning + 1.5 * day,
  sinceMs: morning - 9.5 * hour,
  recordings: 4,
  event: 'rose',
  zone: zoneOf('D', {
    change: { by: 3.41e-3, reference: 1.8e-3, threshold: 0.7e-3, significant: true, since: 'baseline' },
  }),
  before: {
    last: [4.71e-3, 4.38e-3, 3.1e-3, 2.95e-3].map((level, index) => ({
      usedMs: morning - (index + 1.5) * hour,
      level,
    })),
    dayBefore: { usedMs: morning - day, level: 2.9e-3 },
    weekBefore: { usedMs: morning - 7 * day, level: 2.1e-3 },
    baseline: 1.8e-3,
  },
  trend: null,
  lines: {
    display: mPerS2,
    comparedWithMs: morning - 7 * day - hour / 2,
    lines: [
      { frequencyHz: 49.52, order: 1, names: ['1x'], level: 1.62, levelBefore: 0.61 },
      { frequencyHz: 99.04, order: 2, names: ['2x'], level: 0.311, levelBefore: 0.302 },
      {
        frequencyHz: 198.1,
        order: 4,
        names: ['4x', 'blade pass, fan wheel'],
        level: 0.12,
        levelBefore: null,
      },
      { frequencyHz: 3127, order: 63.1, names: [], level: null, levelBefore: 0.09 },
    ],
  },
  otherPoints: [
    { point: driveV, band: overall, level: levelOf(3.1e-3), share: 3.1 / 2.8 },
    { point: otherH, band: bearing, level: levelOf(4.4), share: 4.4 / 12 },
  ],
  recording: {
    fileName: 'blower-1_20261201T060000Z.wav',
    startMs: morning - hour / 2,
    arrivedMs: morning - hour / 2 + 20_000,
    arrival: 'in-time',
    durationS: 10,
    speed: { rpm: 2971, origin: 'sidecar', uncertaintyRpm: 3 },
    loadPercent: 80,
    averaging: {
      window: 'hann',
      overlapPercent: 50,
      segmentSamples: 16_384,
      lineSpacingHz: 1.5625,
      averages: 30,
      effectiveAverages: 28.7,
      usedPercent: 99.2,
      segmentSpread: 0.61,
    },
    quality: [],
  },
};

/** The other direction of the same bearing, an alert from a clipped recording that came late. */
export const alert: AlarmFacts = {
  ...danger,
  number: 18,
  severity: 'alert',
  point: driveV,
  limit: zoneLimit,
  zone: zoneOf('C', { atLeast: true, machine: { letter: 'D', point: driveH } }),
  level: levelOf(3.1e-3, morning - hour / 2, true),
  action: null,
  respondByMs: null,
  event: 'exceeded-came-late',
  recordings: 1,
  sinceMs: morning - 5 * hour,
  change: null,
  before: { last: [], dayBefore: null, weekBefore: null, baseline: null },
  trend: rising,
  lines: null,
  otherPoints: [],
  recording: {
    ...danger.recording,
    arrival: 'late',
    speed: { rpm: 2970, origin: 'nominal', uncertaintyRpm: 0 },
    loadPercent: null,
    fileName: null,
    quality: [{ flag: 'clipped', detail: '212 samples at full scale' }],
  },
};

export const deadSensor: TroubleFacts = {
  kind: 'trouble',
  number: 19,
  ...unacknowledged,
  trouble: 'dead-sensor',
  machine: pump,
  point: driveH,
  source: null,
  detail: 'hum only: 92 % of the power at 50 Hz and its multiples',
  lastGoodMs: morning - 31 * hour,
  expectedEveryMs: null,
  sinceMs: morning - 30 * hour,
  recordings: 31,
  event: 'raised',
};

export const overdue: TroubleFacts = {
  ...deadSensor,
  number: 20,
  trouble: 'overdue',
  machine: fan,
  point: otherH,
  detail: null,
  lastGoodMs: morning - 3.2 * hour,
  expectedEveryMs: hour,
  sinceMs: morning - 1.2 * hour,
  recordings: 0,
};

export const unreadable: TroubleFacts = {
  ...deadSensor,
  number: 21,
  trouble: 'unreadable',
  machine: null,
  point: null,
  source: 'fan-3_<any>.wav',
  detail: 'fan-3_20261201T030000Z.wav: the header promises 409600 bytes, the file has 4096',
  lastGoodMs: morning - 4 * hour,
  sinceMs: morning - 3 * hour,
  recordings: 2,
};

export function mailFacts(parts: Partial<AlarmMailFacts>): AlarmMailFacts {
  return {
    site,
    machine: blower,
    writtenMs: morning,
    alarms: [],
    troubles: [],
    threadSubject: null,
    test: false,
    ...parts,
  };
}

const steady = { ratio: 1.01, ordinaryRatio: 1.12, worse: false };

function bandsOf(overallLevel: number, bearingLevel: number, change: Partial<BandNow> = {}): BandNow[] {
  return [
    {
      band: overall,
      level: levelOf(overallLevel),
      limits: [overallLimit],
      change: steady,
      zone: null,
      ...change,
    },
    {
      band: bearing,
      level: levelOf(bearingLevel),
      limits: [bearingLimit],
      change: { ...steady, ratio: 0.97 },
      zone: null,
    },
  ];
}

const pointNow = (
  machine: MachineFacts,
  point: PointFacts,
  bands: BandNow[],
  judging: PointNow['judging'] = 'judged',
): PointNow => ({ machine, point, judging, lastMs: morning - hour / 2, bands });

export const repair: RepairFacts = {
  kind: 'repair',
  atMs: morning - 6 * day - 14 * hour,
  by: 'A. Fitter',
  comment: 'drive end bearing replaced',
  machine: fan,
  point: null,
  daysSince: 5,
  bands: [
    {
      point: driveV,
      band: overall,
      condition: '',
      before: { level: 5.21e-3, days: 14 },
      after: { level: 1.4e-3, days: 5 },
    },
    {
      point: driveV,
      band: shaft,
      condition: 'full-load',
      before: { level: 12.1e-6, days: 9 },
      after: { level: 12.4e-6, days: 4 },
    },
  ],
};

export const summaryFacts: SummaryFacts = {
  site,
  writtenMs: morning,
  sinceMs: morning - day,
  points: [
    pointNow(
      blower,
      driveH,
      bandsOf(5.21e-3, 4.1, { change: danger.change, zone: danger.zone, trend: { ...rising, ahead: null } }),
    ),
    pointNow(blower, driveV, bandsOf(3.1e-3, 3.9, { zone: zoneOf('C', { atLeast: true }), trend: rising })),
    pointNow(
      blower,
      otherH,
      bandsOf(1.44e-3, 4.4, {
        change: { ratio: 0.62, ordinaryRatio: 1.12, worse: false },
        zone: zoneOf('B', {
          change: { by: -0.88e-3, reference: 2.32e-3, threshold: 0.7e-3, significant: true, since: 'week' },
        }),
      }),
    ),
    pointNow(pump, driveH, bandsOf(0.02e-3, 0.03), 'blind'),
    pointNow(
      pump,
      otherH,
      bandsOf(1.8e-3, 2.2, {
        change: { ratio: 1.42, ordinaryRatio: 1.16, worse: true },
        trend: rising.ahead && { ...rising, ahead: { ...rising.ahead, severity: 'alert', at: 2.8e-3 } },
        sister: { ratio: 2.14, usualRatio: 1.12, sisters: [blower, fan], leaves: true },
      }),
    ),
    { ...pointNow(fan, driveH, [], 'no-limit') },
    {
      ...pointNow(fan, otherH, bandsOf(2.2e-3, 1.1), 'blind'),
      lastMs: morning - 3.2 * hour,
    },
  ],
  standing: [
    { ...danger, change: danger.change },
    alert,
    deadSensor,
    overdue,
    unreadable,
    {
      ...danger,
      number: 9,
      severity: 'alert',
      standing: 'acknowledged',
      acknowledgedBy: 'K. Example',
      acknowledgedMs: morning - 2 * day,
      machine: pump,
      point: driveV,
      level: levelOf(2.91e-3),
      change: { ratio: 0.98, ordinaryRatio: 1.1, worse: false },
      respondByMs: morning + day,
      sinceMs: morning - 2.4 * day,
    },
    {
      ...deadSensor,
      number: 5,
      trouble: 'wrong-rate',
      standing: 'out-of-service',
      suppressedUntilMs: morning + 3 * day,
      machine: fan,
      point: driveV,
      detail: 'configured 25.6 kHz, file 12.8 kHz',
    },
  ],
  repairs: [repair],
  longStopped: [],
  limitsRemoved: [],
  recordings: { received: 165, expected: 168, repeats: 1, late: 0, quarantined: 2, unassigned: 0 },
  history: { yesterday: 2, week: 3, frequent: [{ machine: blower, point: driveH, count: 2 }] },
  service: {
    upSinceMs: morning - 41 * day - 2 * hour,
    mailWaiting: 0,
    mailFailed: 0,
    mailLastAcceptedMs: morning - 9.4 * hour,
    mailLastAnswer: null,
    diskDaysLeft: 412.6,
    diskFreeBytes: 81.2e9,
    lastBackupMs: morning - 4.5 * hour,
  },
};

/** A quiet morning. */
export const quietFacts: SummaryFacts = {
  ...summaryFacts,
  points: [
    pointNow(blower, driveV, bandsOf(1.3e-3, 3.9, { zone: zoneOf('A') })),
    pointNow(blower, otherH, bandsOf(1.44e-3, 4.4, { zone: zoneOf('B') })),
  ],
  standing: [],
  repairs: [],
  recordings: { received: 48, expected: 48, repeats: 0, late: 0, quarantined: 0, unassigned: 0 },
  history: { yesterday: 0, week: 0, frequent: [] },
};
