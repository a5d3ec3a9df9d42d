import { printNumber } from '../config/print-value.ts';
import type { DisplayUnit } from '../config/site.ts';
import type { TimeToLimit, Trend, TrendLine, TrendStep } from '../prognosis/trend.ts';
import { counted, levelText, percentText } from './level-words.ts';
import { dateText } from './time-words.ts';
import { idText } from './wording.ts';

/** What is said of a band's trend, and where it would lead: a projection of what was, never a promise. */
export interface TrendFacts {
  readonly trend: Trend;
  /** calendar: the ledger does not know the machine's running hours of all these days. */
  readonly time: 'running' | 'calendar';
  /** The operating condition in which the levels were compared; '' where the machine has one only. */
  readonly condition: string;
  /** A repair or another sensor, before which no level takes part. */
  readonly broken: { readonly kind: 'repair' | 'sensor-changed'; readonly atMs: number } | null;
  /** The next limit that a rise or fall has before it; null: there is none, or none that holds there. */
  readonly ahead: LimitAhead | null;
}

export interface LimitAhead {
  /** Id of the limit. */
  readonly limit: string;
  readonly severity: 'alert' | 'danger';
  /** SI r.m.s. */
  readonly at: number;
  /** From the band's newest recording on. */
  readonly time: TimeToLimit;
}

/** Days ahead beyond which no number is given: three times what was looked back at. */
const farthestDays = 90;

/**
 * 'rose by 64 % over 30 running days (p < 0.01); if it went on so, it would reach the danger limit (7.1 mm/s r.m.s.) in about 9
 * days of running, between 6 and 16 (90 %). A projection, not a promise.'
 */
export function trendSentence(facts: TrendFacts, display: DisplayUnit, timeZone: string): string {
  const { trend } = facts;
  switch (trend.kind) {
    case 'too-few-days':
      return `no trend yet: ${trend.days} of ${trend.needed} ${dayWord(facts)}${inCondition(facts)}${sinceText(facts, timeZone)}`;
    case 'none':
      return noneText(facts, trend);
    case 'step':
      return stepText(facts, trend, timeZone);
    default: {
      const p = trend.p < 0.001 ? 'p < 0.001' : 'p < 0.01';
      const ahead = facts.ahead === null ? '' : `; ${aheadText(facts, facts.ahead, display)}`;
      const caution = facts.ahead === null ? '' : '. A projection, not a promise.';
      return `${courseText(facts, trend)} (${p})${ahead}${caution}`;
    }
  }
}

/** A level that began to grow lately has no even trend; that it moved must be said all the same. */
function noneText(facts: TrendFacts, { days, endsAt }: Extract<Trend, { kind: 'none' }>): string {
  const over = `over ${days} ${dayWord(facts)}${inCondition(facts)}`;
  if (endsAt === null) return `no trend ${over}`;
  const moved = `${endsAt > 1 ? 'rose' : 'fell'} ${factorText(endsAt)}`;
  return `no even trend ${over}, but from the first three to the last three of them it ${moved}`;
}

/** The same for a line of the summary; null where there is nothing that moved. */
export function trendInShort(facts: TrendFacts, display: DisplayUnit, timeZone: string): string | null {
  const { trend, ahead } = facts;
  if (trend.kind === 'step') return stepText(facts, trend, timeZone);
  if (trend.kind !== 'rising' && trend.kind !== 'falling') return null;
  if (ahead === null || !isProjected(facts)) return courseText(facts, trend);
  const { time } = ahead;
  return `${courseText(facts, trend)}, ${ahead.severity} (${levelText(ahead.at, display)}) in ${aheadDays(facts, time.days)}, ${rangeText(time)}, if it went on so`;
}

/** Whether its line of the summary tells how things would go on, which needs its caution. */
export function isProjected(facts: TrendFacts | null | undefined): boolean {
  return facts?.ahead != null && facts.ahead.time.days <= farthestDays;
}

function courseText(facts: TrendFacts, { kind, growth, days }: TrendLine): string {
  const verb = kind === 'rising' ? 'rose' : 'fell';
  return `${verb} ${factorText(growth)} over ${days} ${dayWord(facts)}${inCondition(facts)}`;
}

function stepText(facts: TrendFacts, { factor, dayMs }: TrendStep, timeZone: string): string {
  const verb = factor > 1 ? 'stepped up' : 'stepped down';
  return `level ${verb} ${factorText(factor)} on ${dateText(dayMs, timeZone)}${inCondition(facts)}, no trend is told across it`;
}

function aheadText(facts: TrendFacts, { severity, at, time }: LimitAhead, display: DisplayUnit): string {
  const limit = `the ${severity} limit (${levelText(at, display)})`;
  if (time.days > farthestDays)
    return `at this rate ${limit} is more than ${farthestDays} days${ofRunning(facts)} away`;
  return `if it went on so, it would reach ${limit} in ${aheadDays(facts, time.days)}, ${rangeText(time)}`;
}

/** 'about 9 days of running'; the time in which a machine stands still does not count. */
function aheadDays(facts: TrendFacts, days: number): string {
  const said = days < 1 ? 'less than a day' : `about ${counted(Math.round(days), 'day')}`;
  return `${said}${ofRunning(facts)}`;
}

function ofRunning({ time }: TrendFacts): string {
  return time === 'running' ? ' of running' : '';
}

/** 'between 6 and 16 (90 %)'; 'from 6 on, perhaps never (90 %)'. */
function rangeText({ earliestDays, latestDays, confidencePercent }: TimeToLimit): string {
  const from = earliestDays < 0.5 ? 'now' : wholeDays(earliestDays);
  const share = `(${printNumber(confidencePercent)} %)`;
  if (latestDays === null || latestDays > 4 * farthestDays) return `from ${from} on, perhaps never ${share}`;
  return `between ${from} and ${wholeDays(Math.max(1, latestDays))} ${share}`;
}

function wholeDays(days: number): string {
  return days.toFixed(0);
}

/** 'by 64 %', 'to 4.2 times', 'by 38 %' of a fall. */
function factorText(factor: number): string {
  if (factor >= 4) return `to ${printNumber(factor, 2)} times`;
  return `by ${percentText(Math.abs(factor - 1))}`;
}

function dayWord({ time }: TrendFacts): string {
  return time === 'running' ? 'running days' : 'days';
}

function inCondition({ condition }: TrendFacts): string {
  return condition === '' ? '' : ` in condition ${idText(condition)}`;
}

function sinceText({ broken }: TrendFacts, timeZone: string): string {
  if (broken === null) return '';
  const what = broken.kind === 'repair' ? 'the repair' : 'the change of sensor';
  return ` since ${what} of ${dateText(broken.atMs, timeZone)}`;
}
