import type { DisplayUnit, Limit, Severity } from '../config/site.ts';
import type { BandLevel } from '../manipulation/measurement.ts';
import type { Condition } from './alarm.ts';
import { rank } from './alarm-event.ts';
import { type LimitSituation, type Thresholds, thresholdsOf } from './thresholds.ts';

/**
 * A band level against a limit. Where the limit stands, thresholds.ts says for each kind; the comparison itself (side,
 * deadband, 'at least', confidence, danger at once) is the same for all.
 */

/** A danger is proven by one recording only where this many segments were averaged. */
export const leastAveragesForDangerAtOnce = 5;

export interface Judgement {
  readonly severity: Condition;
  /** What was compared, and with what; SI r.m.s. */
  readonly at: Thresholds;
  /** One recording is proof enough: at least 80 % of its segments exceed the danger limit on their own. */
  readonly dangerAtOnce: boolean;
}

/** A level and what is needed to judge it. */
export interface JudgedLevel {
  readonly level: BandLevel;
  /** In which the reasons show levels. */
  readonly display: DisplayUnit;
  /** Nominal number of averages behind the level. */
  readonly averages: number;
  readonly situation: LimitSituation;
}

/**
 * Judge one level. The severity is the highest whose threshold is passed: above it on the upper side, below it on the
 * lower. A threshold that the present condition has already passed is held until the value has come back by the
 * deadband (percent of the limit): a limit of 2.8 with 10 % holds above 2.52, on the lower side below 3.08.
 * Hysteresis as in ANSI/ISA-18.2-2016 and OPC 10000-9, B.1.5.
 *
 * @param present condition that stands, after its delays
 * @returns null where the level decides nothing: it is not a number, its limit cannot be reckoned now (no baseline yet), or
 *   it is only known to be *at least* so high and the limit is a lower one
 */
export function judgeLevel(limit: Limit, judged: JudgedLevel, present: Condition): Judgement | null {
  const { level, display, averages, situation } = judged;
  const at = thresholdsOf(limit, level.level, situation, display);
  return 'unknown' in at ? null : judgeAt(limit, at, { level, averages }, present);
}

/** What of a level counts beside its limit. */
export type ComparedLevel = Pick<
  BandLevel,
  'intervalLow' | 'intervalHigh' | 'exceededBy80Percent' | 'atLeast'
>;

/** The same where it is known where the limit stands. */
export function judgeAt(
  limit: Limit,
  at: Thresholds,
  { level, averages }: { readonly level: ComparedLevel; readonly averages: number },
  present: Condition,
): Judgement | null {
  if (!Number.isFinite(at.value)) return null;
  if (at.side === 'lower' && level.atLeast) return null;
  const passes = (severity: Severity, threshold: number | null): boolean => {
    if (threshold === null) return false;
    const held = rank(present) >= rank(severity);
    if (!isPassed(limit, at, threshold, held)) return false;
    return severity === 'danger' || held || limit.confident !== true || isCertain(at, level, threshold);
  };
  const passed = passes('danger', at.danger) ? 'danger' : passes('alert', at.alert) ? 'alert' : 'normal';
  const severity = heldByMissing(at, passed, present);
  return {
    severity,
    at,
    dangerAtOnce: severity === 'danger' && provesDanger(at, level, averages),
  };
}

/** What stands does not come back past a value that nobody knows now; it can only rise to the one that is known. */
function heldByMissing({ missing }: Thresholds, passed: Condition, present: Condition): Condition {
  if (missing === undefined || present === 'normal') return passed;
  if (missing.severity === 'alert') return passed === 'normal' ? 'alert' : passed;
  return passed === 'alert' ? present : passed;
}

/** The whole interval of the level lies past the threshold. */
function isCertain({ side }: Thresholds, level: ComparedLevel, threshold: number): boolean {
  return side === 'upper' ? level.intervalLow > threshold : level.intervalHigh < threshold;
}

function isPassed(
  { deadbandPercent }: Limit,
  { side, value }: Thresholds,
  threshold: number,
  held: boolean,
): boolean {
  const back = held ? deadbandPercent / 100 : 0;
  return side === 'upper' ? value > threshold * (1 - back) : value < threshold * (1 + back);
}

/** Known for the upper side only: what 80 % of the segments exceed says nothing of what they stay under. */
function provesDanger({ side, danger }: Thresholds, level: ComparedLevel, averages: number): boolean {
  const exceeded = level.exceededBy80Percent;
  return (
    side === 'upper' &&
    averages >= leastAveragesForDangerAtOnce &&
    exceeded !== null &&
    danger !== null &&
    exceeded > danger
  );
}
