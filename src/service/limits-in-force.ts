import type { LimitFacts } from '../advisory/facts.ts';
import type { DisplayUnit, Limit, Machine, Point } from '../config/site.ts';
import { anyCondition, conditionOf } from '../detection/condition.ts';
import {
  type LimitSituation,
  type NoThresholds,
  nothingKnown,
  type Thresholds,
  thresholdsOf,
} from '../detection/thresholds.ts';
import type { Measurement } from '../manipulation/measurement.ts';
import type { Reader } from '../store/lent-connection.ts';
import { newestInTrend } from '../store/past-levels.ts';
import { measurementById, type StoredMeasurement } from '../store/read-measurements.ts';
import { situationsOf } from './limit-situations.ts';
import type { SiteView } from './site-view.ts';

/**
 * Where the limits of a point stand for one of its recordings. Whoever shows a limit asks here: the site file alone has
 * the values of fixed limits and of zones only. What cannot be reckoned says why, so that nobody takes a point for
 * watched that is not.
 */
export interface LimitInForce {
  readonly limit: Limit;
  readonly now: Thresholds | NoThresholds;
}

/** A recording as far as where a limit stands depends on it. */
export interface LimitCircumstances {
  /** Operating condition; null: outside all of them. */
  readonly condition: string | null;
  /** SI r.m.s.; null: the band has no level yet. */
  readonly level: number | null;
  readonly situation: LimitSituation;
}

/** The limit as the service would judge that recording by it. */
export function limitInForce(
  limit: Limit,
  { condition, level, situation }: LimitCircumstances,
  display: DisplayUnit,
): LimitInForce {
  const elsewhere = whyElsewhere(limit, condition);
  if (elsewhere !== null) return { limit, now: { unknown: elsewhere } };
  if (limit.rule === undefined)
    return { limit, now: thresholdsOf(limit, level ?? Number.NaN, situation, display) };
  if (level === null) return { limit, now: { unknown: 'there is no level yet' } };
  const now = thresholdsOf(limit, level, situation, display);
  const isElsewhere = condition === null && !('unknown' in now) && now.missing !== undefined;
  if (!isElsewhere) return { limit, now };
  return { limit, now: { ...now, missing: { ...now.missing, why: ranElsewhere } } };
}

const ranElsewhere = 'the machine ran in none of its operating conditions';

const learned = ['baseline', 'spread', 'change', 'rate'];

function whyElsewhere({ conditions, rule, alert, danger }: Limit, condition: string | null): string | null {
  const within = conditions ?? null;
  if (condition === null) {
    const isLearned = rule !== undefined && learned.includes(rule.by) && alert === null && danger === null;
    const asks = within !== null || isLearned;
    return asks ? ranElsewhere : null;
  }
  if (within === null || within.includes(condition)) return null;
  return `it holds in ${within.join(', ')} only; the machine ran in ${condition}`;
}

/** Of a machine without a list all running is one condition; a standing machine tells none of a list. */
export function conditionOfStored(
  { conditions = [] }: Pick<Machine, 'conditions'>,
  measurement: Pick<StoredMeasurement, 'condition'> | null,
): string | null {
  return measurement?.condition ?? (conditions.length === 0 ? anyCondition : null);
}

/** All limits of a point for a stored recording of it; null: it has none yet. In the order of the site file. */
export async function limitsInForce(
  reader: Reader,
  view: SiteView,
  point: Point,
  measurement: StoredMeasurement | null,
): Promise<LimitInForce[]> {
  const { machineId, id } = point;
  const bandIds = new Map(point.bands.map((band) => [view.ids.bandId(machineId, id, band.id), band.id]));
  return limitsOfStored(reader, {
    machine: view.machine(machineId),
    point,
    measurement,
    bandIds,
    machineLedgerId: view.ids.machineId(machineId),
  });
}

/** The same where the ledger may know the point by a former id. `bandIds`: ids of the site file by the ledger's. */
export async function limitsOfStored(
  reader: Reader,
  of: {
    readonly machine: Machine;
    readonly point: Point;
    readonly measurement: StoredMeasurement | null;
    readonly bandIds: ReadonlyMap<number, string>;
    readonly machineLedgerId: number;
  },
): Promise<LimitInForce[]> {
  const { point, measurement } = of;
  const condition = conditionOfStored(of.machine, measurement);
  const levels = (measurement?.levels ?? []).flatMap(({ bandId: bandLedgerId, level, seriesId }) => {
    const bandId = of.bandIds.get(bandLedgerId);
    return bandId === undefined ? [] : [{ bandId, bandLedgerId, level, seriesId }];
  });
  const situations =
    measurement === null
      ? new Map<string, LimitSituation>()
      : await situationsOf(reader, {
          point,
          machineLedgerId: of.machineLedgerId,
          pointLedgerId: measurement.pointId,
          usedMs: measurement.usedMs,
          speed: measurement.speed,
          loadPercent: measurement.loadPercent,
          condition,
          levels,
        });
  return pointLimits(point, {
    condition,
    levelOf: (bandId) => levels.find((one) => one.bandId === bandId)?.level ?? null,
    situationOf: (bandId) => situations.get(bandId) ?? nothingKnown,
  });
}

/** For a recording that was analysed on the spot, without a past: a limit that is learned has none yet. */
export function limitsOfMeasured(machine: Machine, point: Point, measurement: Measurement): LimitInForce[] {
  const { speed, loadPercent, levels } = measurement;
  const speedHz = speed === null || speed.origin === 'nominal' ? null : speed.rpm / 60;
  return pointLimits(point, {
    condition: conditionOf(machine.conditions ?? [], measurement),
    levelOf: (bandId) => levels.find((one) => one.bandId === bandId)?.level ?? null,
    situationOf: () => ({ ...nothingKnown, speedHz, loadPercent }),
  });
}

/** The limits of a point for a recording that is described band by band. */
export function pointLimits(
  point: Point,
  recording: {
    readonly condition: string | null;
    readonly levelOf: (bandId: string) => number | null;
    readonly situationOf: (bandId: string) => LimitSituation;
  },
): LimitInForce[] {
  return point.limits.flatMap((limit) => {
    const { bandId } = limit;
    const band = point.bands.find(({ id }) => id === bandId);
    if (band === undefined) return [];
    const level = recording.levelOf(bandId);
    const situation = recording.situationOf(bandId);
    return [limitInForce(limit, { condition: recording.condition, level, situation }, band.display)];
  });
}

/** As messages show it. */
export function limitFactsNow({ limit, now }: LimitInForce): LimitFacts {
  const { id, side } = limit;
  if ('unknown' in now) return { id, side, alert: null, danger: null, unknown: now.unknown };
  const { alert, danger, why, provisional, confirmedBy, value, missing } = now;
  return {
    id,
    side: now.side,
    alert,
    danger,
    reasons: why,
    ...(limit.rule?.by === 'rate' ? { compared: value } : {}),
    ...(provisional ? { provisional } : {}),
    ...(confirmedBy === null ? {} : { confirmedBy }),
    ...(missing === undefined ? {} : { unknown: missingText(missing) }),
  };
}

/** 'alert: no baseline yet: 3 of 7 running days'. */
export function missingText({ severity, why }: NonNullable<Thresholds['missing']>): string {
  return `${severity}: ${why}`;
}

/** A limit of the site file that judges nothing now, or one of its two values. */
export interface UnwatchedLimit {
  readonly point: Point;
  readonly limit: Limit;
  readonly why: string;
}

/** Older levels say nothing of what a limit does now. */
const oldestMs = 60 * 86_400_000;

/** Limits that cannot be reckoned from the newest recording of the trend; limits that stand are not looked at. */
export async function unwatchedLimits(
  reader: Reader,
  view: SiteView,
  nowMs: number,
): Promise<UnwatchedLimit[]> {
  const found: UnwatchedLimit[] = [];
  for (const point of view.points) {
    if (!point.limits.some(({ rule }) => rule !== undefined)) continue;
    const pointId = view.ids.pointId(point.machineId, point.id);
    const newest = await newestInTrend(reader, pointId, nowMs - oldestMs);
    const measurement = newest === null ? null : await measurementById(reader, newest);
    for (const { limit, now } of await limitsInForce(reader, view, point, measurement)) {
      if (limit.rule === undefined) continue;
      if ('unknown' in now) found.push({ point, limit, why: now.unknown });
      else if (now.missing !== undefined) found.push({ point, limit, why: missingText(now.missing) });
    }
  }
  return found;
}
