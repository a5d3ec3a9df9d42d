import type { Ceiling, CurveValue, LimitRule } from '../config/limit-rules.ts';
import { printLevel, printNumber } from '../config/print-value.ts';
import type { DisplayUnit, Limit } from '../config/site.ts';
import { fitLine, slopeHalfWidth } from '../signal/line-fit.ts';
import { type Baseline, baselineRules, isUsable } from './baseline.ts';

/** What a limit may need to know of a recording besides its level. */
export interface LimitSituation {
  /** Of the level's series in the recording's operating condition. */
  readonly baseline: Baseline | null;
  /** Measured, not nominal; null: unknown. */
  readonly speedHz: number | null;
  readonly loadPercent: number | null;
  /** Levels of the same series and condition, oldest first, the present one last; as far back as the limit looks. */
  readonly past: readonly { readonly usedMs: number; readonly level: number }[];
}

export const nothingKnown: LimitSituation = { baseline: null, speedHz: null, loadPercent: null, past: [] };

/** Where a limit stands for one recording, and why. */
export interface Thresholds {
  /** What is compared with them, SI r.m.s.; for a rate the line's level now. */
  readonly value: number;
  readonly side: 'upper' | 'lower';
  readonly alert: number | null;
  readonly danger: number | null;
  readonly why: { readonly alert: string | null; readonly danger: string | null };
  /** It is reckoned from a baseline that is still provisional. */
  readonly provisional: boolean;
  /** A person stands for the baseline, which had been refused or was frozen. */
  readonly confirmedBy: string | null;
  /** The learned one of the two values cannot be reckoned now (it is null above), and why; the site's own one counts. */
  readonly missing?: { readonly severity: 'alert' | 'danger'; readonly why: string };
}

/** Why a limit cannot be reckoned now. */
export interface NoThresholds {
  readonly unknown: string;
}

const dayMs = 86_400_000;
/** Levels below which a rate says nothing: three days of one recording a day, or as many of one shift. */
const leastForRate = 8;

/**
 * The values that hold for a level: as they stand, or reckoned from baseline, speed, load or the levels before. A learned
 * value never passes its ceiling.
 *
 * @param level SI r.m.s.
 * @param display in which the words show levels
 */
export function thresholdsOf(
  limit: Limit,
  level: number,
  situation: LimitSituation,
  display: DisplayUnit,
): Thresholds | NoThresholds {
  const rule: LimitRule = limit.rule ?? { by: 'stands' };
  const plain = { value: level, side: limit.side, provisional: false, confirmedBy: null };
  switch (rule.by) {
    case 'stands': {
      const why = limit.reasons ?? { alert: null, danger: null };
      return { ...plain, alert: limit.alert, danger: limit.danger, why };
    }
    case 'rate':
      return rateOf(rule, limit, situation, display);
    case 'curve':
      return curveAt(rule, limit, level, situation);
    default:
      return learned(rule, limit, level, situation.baseline, display);
  }
}

type LearnedRule = Extract<LimitRule, { readonly by: 'baseline' | 'spread' | 'change' }>;

function learned(
  rule: LearnedRule,
  limit: Limit,
  level: number,
  baseline: Baseline | null,
  display: DisplayUnit,
): Thresholds | NoThresholds {
  if (!isUsable(baseline)) return ownLevels(rule, limit, level, whyUnusable(baseline));
  const usual = Math.exp(baseline.medianLog);
  const said = `${printLevel(usual, display)}, the median of ${baseline.runningDays} running days`;
  const side = rule.by === 'change' ? (level >= usual ? 'upper' : 'lower') : limit.side;
  const sign = side === 'upper' ? 1 : -1;
  const reckon = (by: number | null): Value | null => {
    if (by === null) return null;
    if (rule.by === 'baseline') return { value: by * usual, why: `${printNumber(by)} times ${said}` };
    if (rule.by === 'change')
      return {
        value: Math.max(0, usual + sign * by),
        why: `${printLevel(by, display)} ${sign > 0 ? 'over' : 'under'} ${said}`,
      };
    const spread = printNumber(100 * Math.expm1(baseline.spreadLog), 2);
    const words = `${printNumber(by)} spreads of ${spread} % ${sign > 0 ? 'above' : 'below'} ${said}`;
    return { value: usual * Math.exp(sign * by * baseline.spreadLog), why: words };
  };
  const alert = held(reckon(rule.alert), limit.ceilings?.alert ?? null, side, display);
  const danger =
    rule.by === 'change' ? null : held(reckon(rule.danger), limit.ceilings?.danger ?? null, side, display);
  return {
    value: level,
    side,
    ...valuesOf(limit, alert, danger),
    provisional: baseline.state === 'provisional',
    confirmedBy: baseline.confirmed?.by ?? null,
  };
}

/** A level that the site gave beside a learned value is known from the first recording on. */
function ownLevels(rule: LearnedRule, limit: Limit, level: number, why: string): Thresholds | NoThresholds {
  const { alert, danger, side } = limit;
  if (alert === null && danger === null) return { unknown: why };
  const isMissing = rule.alert === null || alert !== null ? 'danger' : 'alert';
  return {
    value: level,
    side,
    alert,
    danger,
    why: limit.reasons ?? { alert: null, danger: null },
    provisional: false,
    confirmedBy: null,
    missing: { severity: isMissing, why },
  };
}

interface Value {
  readonly value: number;
  readonly why: string;
}

/** The site's own level stands where the rule gives none. */
function valuesOf(
  limit: Limit,
  alert: Value | null,
  danger: Value | null,
): Pick<Thresholds, 'alert' | 'danger' | 'why'> {
  const reasons = limit.reasons ?? null;
  return {
    alert: alert?.value ?? limit.alert,
    danger: danger?.value ?? limit.danger,
    why: {
      alert: alert?.why ?? reasons?.alert ?? null,
      danger: danger?.why ?? reasons?.danger ?? null,
    },
  };
}

function held(
  value: Value | null,
  ceiling: Ceiling | null,
  side: 'upper' | 'lower',
  display: DisplayUnit,
): Value | null {
  if (value === null || ceiling === null || side === 'lower' || value.value <= ceiling.value) return value;
  const instead = `${printLevel(value.value, display)} (${value.why})`;
  return { value: ceiling.value, why: `${ceiling.why}, in place of ${instead}` };
}

function whyUnusable(baseline: Baseline | null): string {
  if (baseline?.state === 'refused') return `the baseline is refused: ${baseline.refused}`;
  return `no baseline yet: ${baseline?.runningDays ?? 0} of ${baselineRules.provisionalDays} running days`;
}

/**
 * Growth of the line through the logarithms of the levels over the rule's time. Where the line may as well be level
 * (95 %), it has not grown: a few scattered levels are no rate.
 */
function rateOf(
  rule: Extract<LimitRule, { readonly by: 'rate' }>,
  limit: Limit,
  { past }: LimitSituation,
  display: DisplayUnit,
): Thresholds | NoThresholds {
  const newest = past.at(-1);
  const within =
    newest === undefined ? [] : past.filter(({ usedMs }) => usedMs > newest.usedMs - rule.overMs);
  const line =
    within.length < leastForRate || newest === undefined
      ? null
      : fitLine(
          within.map(({ usedMs }) => (usedMs - newest.usedMs) / rule.overMs),
          within.map(({ level }) => Math.log(level)),
        );
  const oldest = within.at(0);
  if (line === null || newest === undefined || oldest === undefined)
    return { unknown: `a rate needs ${leastForRate} levels within its time, there are ${within.length}` };
  // A line through the last hours would say anything of a week.
  if (newest.usedMs - oldest.usedMs < rule.overMs / 2)
    return { unknown: 'the levels reach over less than half of the time over which the rate is reckoned' };
  const doubtful = Math.abs(line.slope) <= slopeHalfWidth(line, 95);
  const before = Math.exp(line.intercept - line.slope);
  const side = limit.side;
  const reckon = (by: number | null): Value | null =>
    by === null
      ? null
      : {
          value: before * by,
          why: `${printNumber(by)} times ${printLevel(before, display)}, its line ${spanText(rule.overMs)} before`,
        };
  return {
    value: doubtful ? before : Math.exp(line.intercept),
    side,
    ...valuesOf(limit, reckon(rule.alert), reckon(rule.danger)),
    provisional: false,
    confirmedBy: null,
  };
}

function spanText(ms: number): string {
  return ms < dayMs ? `${printNumber(ms / 3_600_000)} h` : `${printNumber(ms / dayMs)} d`;
}

/** On the curve at the recording's speed or load; beyond its ends the outermost value holds. */
function curveAt(
  { over, values }: Extract<LimitRule, { readonly by: 'curve' }>,
  limit: Limit,
  level: number,
  { speedHz, loadPercent }: LimitSituation,
): Thresholds | NoThresholds {
  const at = over === 'speed' ? speedHz : loadPercent;
  if (at === null) return { unknown: `the recording has no measured ${over}` };
  const shown = over === 'speed' ? `${printNumber(at * 60, 4)} rpm` : `${printNumber(at)} % load`;
  const reckon = (severity: 'alert' | 'danger'): Value | null => {
    const value = between(values, at, severity);
    return value === null ? null : { value, why: `${shown} of its curve` };
  };
  return {
    value: level,
    side: limit.side,
    ...valuesOf(limit, reckon('alert'), reckon('danger')),
    provisional: false,
    confirmedBy: null,
  };
}

function between(values: readonly CurveValue[], at: number, severity: 'alert' | 'danger'): number | null {
  const known = values.flatMap((value) => {
    const level = value[severity];
    return level === null ? [] : [{ at: value.at, level }];
  });
  const above = known.findIndex((value) => value.at >= at);
  if (known.length === 0) return null;
  if (above === -1) return known[known.length - 1].level;
  if (above === 0) return known[0].level;
  const [low, high] = [known[above - 1], known[above]];
  return low.level + ((at - low.at) / (high.at - low.at)) * (high.level - low.level);
}
