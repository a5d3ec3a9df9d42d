import type { Limit, LimitKind, Severity } from '../config/site.ts';
import type { BandLevel } from '../manipulation/measurement.ts';
import type { Condition } from './alarm.ts';
import { rank } from './alarm-event.ts';

/**
 * A band level against a limit. Each kind of limit says what is compared with what; the comparison itself (side,
 * deadband, 'at least', danger at once) is the same for all.
 */

/** A danger is proven by one recording only where this many segments were averaged. */
export const leastAveragesForDangerAtOnce = 5;

export interface Judgement {
  readonly severity: Condition;
  /** What was compared: SI r.m.s. for a fixed limit. */
  readonly value: number;
  /** The thresholds it was compared with, in the same unit. */
  readonly alert: number | null;
  readonly danger: number | null;
  /** One recording is proof enough: at least 80 % of its segments exceed the danger limit on their own. */
  readonly dangerAtOnce: boolean;
}

/** What a kind of limit compares. null: it cannot be said now (no baseline yet). */
interface Comparison {
  readonly value: number;
  readonly alert: number | null;
  readonly danger: number | null;
}

const comparisons: Readonly<Record<LimitKind, (limit: Limit, level: BandLevel) => Comparison | null>> = {
  fixed: asTheyStand,
  // Worked out from the table when the site file was read; they move with the site file alone.
  zone: asTheyStand,
};

function asTheyStand({ alert, danger }: Limit, { level }: BandLevel): Comparison {
  return { value: level, alert, danger };
}

/**
 * Judge one level. The severity is the highest whose threshold is passed: above it on the upper side, below it on the
 * lower. A threshold that the present condition has already passed is held until the value has come back by the
 * deadband (percent of the limit): a limit of 2.8 with 10 % holds above 2.52, on the lower side below 3.08.
 * Hysteresis as in ANSI/ISA-18.2-2016 and OPC 10000-9, B.1.5.
 *
 * @param averages nominal number of averages behind the level
 * @param present condition that stands, after its delays
 * @returns null where the level decides nothing: it is not a number, or it is only known to be *at least* so high and
 *   the limit is a lower one
 */
export function judgeLevel(
  limit: Limit,
  level: BandLevel,
  averages: number,
  present: Condition,
): Judgement | null {
  const compared = comparisons[limit.kind](limit, level);
  if (compared === null || !Number.isFinite(compared.value)) return null;
  if (limit.side === 'lower' && level.atLeast) return null;
  const { value, alert, danger } = compared;
  const passes = (severity: Severity, threshold: number | null): boolean =>
    threshold !== null && isPassed(limit, value, threshold, rank(present) >= rank(severity));
  const severity = passes('danger', danger) ? 'danger' : passes('alert', alert) ? 'alert' : 'normal';
  return {
    severity,
    value,
    alert,
    danger,
    dangerAtOnce: severity === 'danger' && provesDanger(limit, level, averages, danger),
  };
}

function isPassed(limit: Limit, value: number, threshold: number, held: boolean): boolean {
  const back = held ? limit.deadbandPercent / 100 : 0;
  return limit.side === 'upper' ? value > threshold * (1 - back) : value < threshold * (1 + back);
}

/** Known for the upper side only: what 80 % of the segments exceed says nothing of what they stay under. */
function provesDanger(limit: Limit, level: BandLevel, averages: number, danger: number | null): boolean {
  const exceeded = level.exceededBy80Percent;
  return (
    limit.side === 'upper' &&
    averages >= leastAveragesForDangerAtOnce &&
    exceeded !== null &&
    danger !== null &&
    exceeded > danger
  );
}
