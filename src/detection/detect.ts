import type { QualityFlag } from '../acquisition/recording.ts';
import type { Limit, Point } from '../config/site.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import {
  type AlarmChange,
  type AlarmState,
  type AlarmSubject,
  normalState,
  subjectKey,
  type TroubleKind,
} from './alarm.ts';
import { entry, rank } from './alarm-event.ts';
import { alarmStep } from './alarm-state.ts';
import { type Judgement, judgeLevel } from './limits.ts';
import type { MachineState } from './machine-state.ts';
import { type LimitSituation, nothingKnown } from './thresholds.ts';
import { changeOf, looksDead, type TroubleSubject, troubleStep } from './trouble.ts';

/**
 * One measurement of one point: what it does to the point's alarms and troubles.
 *
 * - Recordings of a standing or starting machine are not held against limits: they raise nothing and clear nothing.
 * - A late recording changes no state. A level over a limit whose alarm does not stand is journalled and told.
 * - A level that is missing (too short a recording, an uneven time column) raises nothing and clears nothing.
 * - Any quality flag on a recording keeps it from clearing; none keeps it from raising.
 */
export interface DetectionInput {
  readonly point: Point;
  readonly measurement: Measurement;
  readonly machineState: MachineState;
  /** As `machineStep` gives it. */
  readonly readsStopped: boolean | null;
  readonly usedMs: number;
  /** It starts before the newest evaluated recording of its point. */
  readonly late: boolean;
  /** Flags of the recording as a whole (clock, repeats), besides those of the measurement. */
  readonly recordingFlags: readonly QualityFlag[];
  /** Operating condition of the recording; null: outside all, or not running. */
  readonly condition: string | null;
  /** What limits may need besides a band's level, by band; what is missing is unknown. */
  readonly situations: ReadonlyMap<string, LimitSituation>;
  /** By `subjectKey`; what is missing is normal. */
  readonly earlier: ReadonlyMap<string, AlarmState>;
  /**
   * Left out: everything. `limits`: no troubles, which are looked at with each recording, not with a pool of them.
   * `danger-at-once`: of the limits only a danger that the recording's own segments prove; its level waits for the pool.
   */
  readonly only?: 'limits' | 'danger-at-once';
}

const pointTroubles = ['dead-sensor', 'reads-stopped', 'wrong-rate', 'uneven-time'] as const;

export function limitSubject(point: Point, limit: Limit): AlarmSubject {
  return {
    kind: 'limit',
    machineId: point.machineId,
    pointId: point.id,
    bandId: limit.bandId,
    limitId: limit.id,
  };
}

export function pointTrouble(point: Point, trouble: TroubleKind): TroubleSubject {
  return { kind: 'trouble', trouble, machineId: point.machineId, pointId: point.id, source: null };
}

/** Everything whose earlier state `detect` may ask for, in the order in which its changes come. */
export function subjectsOf(point: Point): AlarmSubject[] {
  return [
    ...point.limits.map((limit) => limitSubject(point, limit)),
    ...pointTroubles.map((trouble) => pointTrouble(point, trouble)),
  ];
}

/** Changes in a fixed order: limits as in the site file, then troubles. Subjects that do not change are left out. */
export function detect(input: DetectionInput): AlarmChange[] {
  const measured = input.measurement.quality.map(({ flag }) => flag);
  const flags = [...new Set([...measured, ...input.recordingFlags])];
  const judged = input.machineState === 'running';
  const limits = judged ? input.point.limits.map((limit) => detectLimit(limit, flags, input)) : [];
  const troubles = input.late || input.only === 'limits' ? [] : detectTroubles(flags, input);
  return [...limits, ...troubles].filter((change) => change !== null);
}

function detectLimit(limit: Limit, flags: readonly QualityFlag[], input: DetectionInput): AlarmChange | null {
  const { measurement, usedMs } = input;
  const subject = limitSubject(input.point, limit);
  const before = input.earlier.get(subjectKey(subject)) ?? normalState;
  const level = measurement.levels.find(({ bandId }) => bandId === limit.bandId);
  const band = input.point.bands.find(({ id }) => id === limit.bandId);
  if (level === undefined || band === undefined || !holdsIn(limit, input.condition)) return null;
  const averages = measurement.averaging?.averages ?? 0;
  const situation = input.situations.get(limit.bandId) ?? nothingKnown;
  const judged = { level, display: band.display, averages, situation };
  const judgement = judgeLevel(limit, judged, before.condition);
  if (judgement === null) return null;
  const { severity, dangerAtOnce, at } = judgement;
  if (input.only === 'danger-at-once' && !dangerAtOnce) return null;
  const reason = {
    level: at.value,
    quantity: level.quantity,
    kind: limit.kind,
    side: at.side,
    alert: at.alert,
    danger: at.danger,
    why: at.why,
    provisional: at.provisional,
    confirmedBy: at.confirmedBy,
    ...(at.missing === undefined ? {} : { missing: at.missing }),
    condition: input.condition,
    deadbandPercent: limit.deadbandPercent,
    onDelay: limit.onDelay,
    offDelay: limit.offDelay,
    averages,
    exceededBy80Percent: level.exceededBy80Percent,
    atLeast: level.atLeast,
    dangerAtOnce,
    flags,
  };
  // A doubtful speed moves the edges of bands in orders, and nothing else.
  const doubts = flags.filter((flag) => band.inOrders || flag !== 'speed-doubtful');
  if (input.late) return cameLate(subject, before, judgement, reason, usedMs);
  const step = alarmStep(
    before,
    {
      kind: 'judged',
      severity,
      usedMs,
      level: at.value,
      flagged: doubts.length > 0 || level.atLeast,
      atOnce: dangerAtOnce,
      reason,
    },
    { ...limit, side: at.side },
  );
  return changeOf(subject, before, step);
}

/** A limit without a list holds in every running recording, also outside all conditions: none must blind a point. */
function holdsIn({ conditions }: Limit, condition: string | null): boolean {
  return conditions == null || (condition !== null && conditions.includes(condition));
}

/** The state stays, its version too; only the journal and the telling are new. */
function cameLate(
  subject: AlarmSubject,
  before: AlarmState,
  judgement: Judgement,
  reason: Readonly<Record<string, unknown>>,
  usedMs: number,
): AlarmChange | null {
  const { severity } = judgement;
  const level = judgement.at.value;
  if (severity === 'normal' || rank(severity) <= rank(before.condition)) return null;
  const event = 'exceeded-came-late';
  return {
    subject,
    state: before,
    journal: [entry(event, before.condition, before.condition, { usedMs, reason: { ...reason, severity } })],
    tell: before.suppressions.length > 0 ? null : { severity, event, level },
  };
}

function detectTroubles(flags: readonly QualityFlag[], input: DetectionInput): (AlarmChange | null)[] {
  const { point, measurement, machineState, usedMs, readsStopped } = input;
  const look = (trouble: TroubleKind, present: boolean | null, reason: Record<string, unknown>) => {
    const subject = pointTrouble(point, trouble);
    const before = input.earlier.get(subjectKey(subject));
    return present === null ? null : troubleStep(subject, before, { present, usedMs, reason });
  };
  const details = (flag: QualityFlag) =>
    measurement.quality.filter((finding) => finding.flag === flag).map(({ detail }) => detail);
  const dead = looksDead(flags, machineState, measurement.waveform !== null);
  return [
    look('dead-sensor', dead?.present ?? null, {
      flags: dead?.flags ?? [],
      details: (dead?.flags ?? []).flatMap(details),
    }),
    look('reads-stopped', readsStopped, { machineState }),
    look('wrong-rate', flags.includes('wrong-rate'), {
      sampleRateHz: measurement.sampleRateHz,
      configuredHz: point.recordings.sampleRateHz,
      details: details('wrong-rate'),
    }),
    look('uneven-time', flags.includes('uneven-time'), { details: details('uneven-time') }),
  ];
}
