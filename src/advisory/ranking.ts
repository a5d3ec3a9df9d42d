import { madToDeviation, median, medianAbsoluteDeviation } from '../signal/statistics.ts';
import type { LimitFacts, MachineFacts, PastLevel, PointFacts } from './facts.ts';

/**
 * Pure rules of order: what has changed, what comes first, what makes one line.
 */

/** Change of a band: the last 24 h against the 7 days before them. */
export interface Change {
  /** Median of the last 24 h over median of the 7 days before; 1.2 is a fifth more. */
  readonly ratio: number;
  /** Ratio above which a change exceeds the series' own spread: exp(3 x 1.4826 MAD) of the 7 days' log levels about their line. */
  readonly ordinaryRatio: number;
  /** Changed by more than the spread, towards the worse: up, or down where only a lower limit guards the band. */
  readonly worse: boolean;
}

const dayMs = 86_400_000;
/** With fewer levels in the week a median absolute deviation says nothing of the spread. */
const fewestBefore = 5;
/** A very even series would call the smallest step worse; less than a tenth is within what load and heat do. */
const leastRatio = 1.1;

/**
 * Change of one series in one operating condition. `levels`: SI r.m.s. with used times, in any order; those at or
 * before `nowMs - 8 d`, after `nowMs`, or not above zero take no part. Null where the last 24 h hold none or the 7 days
 * before fewer than five. Checked: week 1, 1.1, 0.9, 1, 1, day 2: ratio 2, worse.
 */
export function changeOf(
  levels: readonly PastLevel[],
  nowMs: number,
  guarded: 'upper' | 'lower' = 'upper',
): Change | null {
  const medians = mediansOf(levels, nowMs);
  if (medians === null) return null;
  const { week } = dayAndWeek(levels, nowMs);
  const ratio = medians.day / medians.week;
  const spread = medianAbsoluteDeviation(aboutTheirLine(week));
  const ordinaryRatio = Math.max(leastRatio, Math.exp(3 * madToDeviation * spread));
  const towardsWorse = guarded === 'upper' ? ratio : 1 / ratio;
  return { ratio, ordinaryRatio, worse: towardsWorse > ordinaryRatio };
}

/** Median of the last 24 h and of the 7 days before, SI r.m.s.; null under the same conditions as `changeOf`. */
export function mediansOf(
  levels: readonly PastLevel[],
  nowMs: number,
): { readonly day: number; readonly week: number } | null {
  const { day, week } = dayAndWeek(levels, nowMs);
  if (day.length === 0 || week.length < fewestBefore) return null;
  return { day: median(day.map(({ level }) => level)), week: median(week.map(({ level }) => level)) };
}

function dayAndWeek(
  levels: readonly PastLevel[],
  nowMs: number,
): { readonly day: readonly PastLevel[]; readonly week: readonly PastLevel[] } {
  const usable = levels.filter(({ usedMs, level }) => {
    const age = nowMs - usedMs;
    return level > 0 && age >= 0 && age < 8 * dayMs;
  });
  const isOfDay = ({ usedMs }: PastLevel) => nowMs - usedMs < dayMs;
  return { day: usable.filter(isOfDay), week: usable.filter((one) => !isOfDay(one)) };
}

/**
 * Log levels less their straight line, whose slope is the median over pairs half the series apart (Theil 1950, the
 * incomplete method). Without that a steady rise would hide itself: a week that grows evenly by G has a MAD of G/4, hence a
 * bound of 1.1 G, while the next day's median lies 0.6 G over the week's.
 */
function aboutTheirLine(week: readonly PastLevel[]): number[] {
  const inOrder = [...week].sort((a, b) => a.usedMs - b.usedMs);
  const logs = inOrder.map(({ level }) => Math.log(level));
  const days = inOrder.map(({ usedMs }) => (usedMs - (inOrder[0] as PastLevel).usedMs) / dayMs);
  const half = inOrder.length >> 1;
  const slopes: number[] = [];
  for (let i = 0; i + half < logs.length; i++) {
    const apart = (days[i + half] as number) - (days[i] as number);
    if (apart > 0) slopes.push(((logs[i + half] as number) - (logs[i] as number)) / apart);
  }
  const slope = slopes.length === 0 ? 0 : median(slopes);
  return logs.map((log, i) => log - slope * (days[i] as number));
}

/** The limit that speaks first on a side: alert, or danger where there is no alert. SI r.m.s. */
export function firstLimit(limit: LimitFacts): number | null {
  return limit.alert ?? limit.danger;
}

/** What is held against the limit: the level, of a rate its line's. SI r.m.s. */
export function comparedWith(limit: LimitFacts, level: number): number {
  return limit.compared ?? level;
}

/**
 * Share of the alert limit that a level uses up: 1 at the limit, more beyond it, for upper and lower limits alike.
 * Infinity for nothing against a lower limit; null without a limit to measure by.
 */
export function shareOfAlert(level: number, limit: LimitFacts): number | null {
  const at = firstLimit(limit);
  if (at === null) return null;
  const compared = comparedWith(limit, level);
  return limit.side === 'upper' ? compared / at : at / compared;
}

/** The largest share over several limits of one band; null where none applies. */
export function largestShare(level: number, limits: readonly LimitFacts[]): number | null {
  const shares = limits.map((limit) => shareOfAlert(level, limit)).filter((share) => share !== null);
  return shares.length === 0 ? null : Math.max(...shares);
}

/** What the order of findings looks at. `share`: of the alert limit; null for troubles. */
export interface Ranked {
  readonly machine: MachineFacts | null;
  readonly severity: 'danger' | 'alert' | 'trouble' | null;
  readonly share: number | null;
}

const criticalityRank = { A: 0, B: 1, C: 2 } as const;
const severityRank = { danger: 0, alert: 1, trouble: 2 } as const;

/**
 * Criticality first (what concerns no machine of its own may blind every one and ranks with A), then severity, then the share of the
 * alert limit. For sorting; 0 where neither comes first.
 */
export function byUrgency(a: Ranked, b: Ranked): number {
  return (
    criticalityRank[a.machine?.criticality ?? 'A'] - criticalityRank[b.machine?.criticality ?? 'A'] ||
    (a.severity === null ? 3 : severityRank[a.severity]) -
      (b.severity === null ? 3 : severityRank[b.severity]) ||
    compareShares(a.share, b.share)
  );
}

function compareShares(a: number | null, b: number | null): number {
  const left = a ?? 0;
  const right = b ?? 0;
  return left === right ? 0 : right - left;
}

/**
 * The bearing (or other place) that several directions share: the point's name without its direction, e.g. 'drive
 * end' for 'drive end, horizontal'. The name itself where it does not contain its direction as a word of its own.
 */
export function bearingOf(point: PointFacts): string {
  const direction = point.direction?.trim().toLowerCase() ?? '';
  if (direction === '') return point.name;
  const words = point.name.split(/([\s,;:/()-]+)/);
  const at = words.findIndex((word) => word.toLowerCase() === direction);
  if (at === -1) return point.name;
  words.splice(at, 1);
  const rest = words.join('').replace(/^[\s,;:/()-]+|[\s,;:/()-]+$/g, '');
  return rest === '' ? point.name : rest;
}

/** Puts what shares a key together; groups stand in the order of their first member, members keep their order. */
export function gather<T>(items: readonly T[], keyOf: (item: T) => string): T[][] {
  const groups = new Map<string, T[]>();
  for (const item of items) {
    const key = keyOf(item);
    const group = groups.get(key);
    if (group === undefined) groups.set(key, [item]);
    else group.push(item);
  }
  return [...groups.values()];
}
