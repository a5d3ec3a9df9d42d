import { plain } from '../../advisory/escape.ts';
import { type TrendFacts, trendSentence } from '../../advisory/trend-words.ts';
import { inDisplayUnit } from '../../config/print-value.ts';
import type { DisplayUnit } from '../../config/site.ts';
import type { TrendLine } from '../../prognosis/trend.ts';
import { limitJson } from '../level-json.ts';
import { lineWidth, wrapText } from '../output.ts';

/** What a band's days say as a whole: one line for people, one object for programs. */

export function trendLineText(facts: TrendFacts, display: DisplayUnit, timeZone: string): string[] {
  return wrapText(`trend: ${plain(trendSentence(facts, display, timeZone))}`, lineWidth);
}

export function trendLineJson(
  facts: TrendFacts | null,
  display: DisplayUnit,
): Record<string, unknown> | null {
  if (facts === null) return null;
  const { trend, time, condition, broken } = facts;
  const line = trend.kind === 'rising' || trend.kind === 'falling' ? trend : null;
  const step = trend.kind === 'step' ? trend : null;
  return {
    kind: trend.kind,
    days: step === null ? (trend as { readonly days: number }).days : step.daysSince,
    days_needed: trend.kind === 'too-few-days' ? trend.needed : null,
    time,
    condition: condition === '' ? null : condition,
    since: broken === null ? null : { note: broken.kind, time: new Date(broken.atMs).toISOString() },
    p: trend.kind === 'none' ? trend.p : (line?.p ?? null),
    step: step === null ? null : { time: new Date(step.dayMs).toISOString(), factor: step.factor },
    line: line === null ? null : lineJson(line, display),
    to_limit: toLimitJson(facts, display),
  };
}

function lineJson(line: TrendLine, display: DisplayUnit): Record<string, unknown> {
  return {
    from: new Date(line.fromMs).toISOString(),
    to: new Date(line.toMs).toISOString(),
    growth: line.growth,
    growth_per_day: line.growthPerDay,
    growth_per_day_low: finite(line.growthPerDayLow),
    growth_per_day_high: finite(line.growthPerDayHigh),
    confidence_percent: line.confidencePercent,
    level: inDisplayUnit(line.levelNow, display),
  };
}

function toLimitJson({ ahead }: TrendFacts, display: DisplayUnit): Record<string, unknown> | null {
  if (ahead === null) return null;
  const { limit, severity, at, time } = ahead;
  return {
    limit,
    severity,
    at: limitJson(at, display),
    days: time.days,
    earliest_days: time.earliestDays,
    latest_days: time.latestDays,
    confidence_percent: time.confidencePercent,
  };
}

/** An interval that is open at one end. */
function finite(value: number): number | null {
  return Number.isFinite(value) ? value : null;
}
