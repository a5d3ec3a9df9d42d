import fc from 'fast-check';
import type {
  AlarmFacts,
  MachineFacts,
  PointFacts,
  StandingFacts,
  TroubleFacts,
} from '../../src/advisory/facts.ts';
import type { RepairFacts } from '../../src/advisory/repair-words.ts';
import type { PointNow, SummaryFacts } from '../../src/advisory/summary-facts.ts';
import { troubleName } from '../../src/advisory/wording.ts';
import type { TroubleKind } from '../../src/detection/alarm.ts';
import {
  danger,
  day,
  deadSensor,
  hour,
  levelOf,
  morning,
  overall,
  overallLimit,
  repair,
  rising,
  summaryFacts,
  zoneOf,
} from './sample-facts.ts';

/** Random facts with names as hostile as a file system and a careless site file allow. */

const spite = [
  '<script>alert(1)</script>',
  '"><img src=x onerror=alert(1)>',
  "' onmouseover='x",
  '</style><b>',
  '\r\nBcc: everybody@larkfen.example',
  '\u0000\u0007\u001b[2J',
  '\u202egnp.exe\u2066',
  '\u2028\u2029\ufeff\u200b',
  '\ud800',
  '&lt;b&gt; &amp;',
  'x'.repeat(5000),
  '🏭'.repeat(400),
  '',
  '   ',
];
export const name = fc.oneof(
  fc.constantFrom(...spite),
  fc.string({ unit: 'binary', maxLength: 60 }),
  fc.tuple(fc.constantFrom('drive end, ', 'pump '), fc.constantFrom(...spite)).map((parts) => parts.join('')),
);

const machine: fc.Arbitrary<MachineFacts> = fc.record({
  id: fc.constantFrom('m1', 'm2', 'm3', 'm4'),
  name,
  criticality: fc.constantFrom('A', 'B', 'C'),
});
const point: fc.Arbitrary<PointFacts> = fc.record({
  id: fc.constantFrom('p1', 'p2', 'p3'),
  name,
  direction: fc.oneof(fc.constant(null), name),
});
const ratio = fc.double({ min: 0.01, max: 100, noNaN: true });
const change = fc.oneof(
  fc.constant(null),
  fc.record({ ratio, ordinaryRatio: fc.double({ min: 1.01, max: 3, noNaN: true }), worse: fc.boolean() }),
);
const orNull = <T>(arbitrary: fc.Arbitrary<T>): fc.Arbitrary<T | null> =>
  fc.oneof(fc.constant(null), arbitrary);
const moment = fc.integer({ min: morning - 60 * day, max: morning }).map((ms) => ms - (ms % 1000));

const standing: fc.Arbitrary<Omit<StandingFacts, 'number'>> = fc.record({
  standing: fc.constantFrom(
    'unacknowledged',
    'acknowledged',
    'returned-unacknowledged',
    'latched-unacknowledged',
    'latched-acknowledged',
    'shelved',
    'suppressed',
    'out-of-service',
  ),
  sinceMs: moment,
  recordings: fc.nat(1000),
  respondByMs: orNull(moment.map((ms) => ms + 20 * day)),
  acknowledgedBy: orNull(name),
  acknowledgedMs: orNull(moment),
  suppressedUntilMs: orNull(moment.map((ms) => ms + 60 * day)),
});

export const alarm: fc.Arbitrary<AlarmFacts> = fc
  .tuple(standing, machine, point, fc.record({ name, ratio, change, text: name }), fc.boolean())
  .map(([facts, m, p, random, clipped]) => ({
    ...danger,
    ...facts,
    severity: clipped ? 'alert' : 'danger',
    machine: m,
    point: p,
    band: { ...overall, id: random.name },
    level: levelOf(2.8e-3 * random.ratio, morning - hour, clipped),
    limit: clipped
      ? { ...overallLimit, alert: null, danger: null, unknown: random.text }
      : { ...overallLimit, reasons: { alert: random.text, danger: null }, confirmedBy: random.name },
    change: random.change,
    action: random.text,
    trend: { ...rising, condition: random.text },
    evidence: [
      { grade: 'weak', words: random.name },
      { grade: 'strong', words: random.text },
    ],
    lines: danger.lines && {
      ...danger.lines,
      lines: danger.lines.lines.map((line) => ({ ...line, names: [random.name] })),
    },
    zone: clipped ? zoneOf(null, { why: random.text }) : zoneOf('C', { machine: { letter: 'D', point: p } }),
    recording: {
      ...danger.recording,
      fileName: random.text,
      quality: [{ flag: 'clipped', detail: random.text }],
    },
    number: 0,
  }));

export const trouble: fc.Arbitrary<TroubleFacts> = fc
  .tuple(
    standing,
    orNull(machine),
    orNull(point),
    orNull(name),
    fc.constantFrom(...(Object.keys(troubleName) as TroubleKind[])),
    orNull(name),
  )
  .map(([facts, m, p, detail, kind, source]) => ({
    ...deadSensor,
    ...facts,
    machine: m,
    point: m === null ? null : p,
    detail,
    trouble: kind,
    source,
    number: 0,
  }));

/** Numbers are distinct and not digits of anything else in the message. */
export const numbered = <T extends { readonly number: number }>(items: readonly T[], from: number): T[] =>
  items.map((item, index) => ({ ...item, number: from + index }));

const pointNow: fc.Arbitrary<PointNow> = fc
  .tuple(
    machine,
    point,
    fc.constantFrom('judged', 'stopped', 'blind', 'not-judged', 'no-limit', 'out-of-service') as fc.Arbitrary<
      PointNow['judging']
    >,
    fc.array(fc.tuple(name, ratio, change), { maxLength: 3 }),
  )
  .map(([m, p, judging, bands]) => ({
    machine: m,
    point: p,
    judging,
    lastMs: morning - hour,
    bands: bands.map(([id, level, changed]) => ({
      band: { ...overall, id },
      level: levelOf(level * 1e-3),
      limits: [level > 5 ? { ...danger.limit, alert: null, danger: null, unknown: id } : danger.limit],
      change: changed,
      zone: level > 5 ? null : zoneOf('B'),
      trend: level > 3 ? { ...rising, condition: id } : null,
      sister: level > 2 ? { ratio: level, usualRatio: 1, sisters: [m, m], leaves: level < 4 } : null,
      baselines: [
        {
          condition: id,
          state: level > 5 ? ('refused' as const) : ('provisional' as const),
          runningDays: 9,
          refused: level > 5 ? id : null,
          confirmedBy: changed === null ? null : id,
        },
      ],
    })),
  }));

const repairOf: fc.Arbitrary<RepairFacts> = fc
  .tuple(machine, point, name, fc.array(name, { maxLength: 8 }))
  .map(([m, p, by, ids]) => ({
    ...repair,
    machine: m,
    point: p,
    by,
    bands: ids.flatMap((id) => repair.bands.map((band) => ({ ...band, condition: id }))),
  }));

export const summary: fc.Arbitrary<SummaryFacts> = fc
  .tuple(
    fc.array(alarm, { maxLength: 20 }),
    fc.array(trouble, { maxLength: 12 }),
    fc.array(pointNow, { maxLength: 12 }),
    name,
    fc.array(repairOf, { maxLength: 7 }),
  )
  .map(([alarms, troubles, points, siteName, repairs]) => ({
    ...summaryFacts,
    site: { name: siteName, timeZone: 'Europe/Dublin' },
    points,
    standing: numbered<(typeof alarms)[number] | (typeof troubles)[number]>([...alarms, ...troubles], 70_001),
    repairs: repairs.map((repair) => ({ ...repair, comment: siteName })),
    limitsRemoved: [{ number: 69_999, what: siteName }],
  }));
