import { dependenceFactor, mannKendall, theilSen } from '../signal/rank-trend.ts';
import { madToDeviation, median, medianAbsoluteDeviation, quantile } from '../signal/statistics.ts';

/**
 * What is usual for one level in one operating condition: median and spread of its logarithms over a reference period.
 *
 *     learning --7 running days--> provisional --30--> learned --60--> refined
 *        |            |                |                  (its period has ended: it stays as it is)
 *        +------------+----------------+--> refused: it lies in zone C or D, or rose while it was learned
 *
 *     A person freezes it at any time, confirms a refused one, or has it learned again; each by name and comment.
 *
 * A short period knows little: hourly readings of one week follow each other so closely that they say as much as three
 * independent ones. Until 30 running days are there, the spread is therefore taken as not less than `leastSpread`.
 * Simulated (12 bands a point, spread of 10 % that forgets within 36 h, 4 % from hour to hour, limits at 4.5 spreads,
 * three recordings in a row): a baseline of 48 h gives 147 alarms a point a year, one of 30 days 0.55, of 60 days 0.14.
 */
export type BaselineState = 'learning' | 'provisional' | 'learned' | 'refined' | 'frozen' | 'refused';

export interface Baseline {
  readonly state: BaselineState;
  /** Used times of the first and the last reading in it; null: none yet. */
  readonly fromMs: number | null;
  readonly toMs: number | null;
  readonly runningDays: number;
  readonly recordings: number;
  /** Median of ln level (SI r.m.s.); null where there is not one reading. */
  readonly medianLog: number | null;
  /** 1.4826 times the median absolute deviation of ln level; not below `leastSpread` while provisional. */
  readonly spreadLog: number | null;
  /** Why it is refused, for people; null where it is not. */
  readonly refused: string | null;
  /** Set where a person stands for it although it was refused, or froze it. */
  readonly confirmed: { readonly by: string; readonly comment: string } | null;
}

/** A good recording: unflagged, the machine running in this condition. Oldest first. */
export interface GoodLevel {
  readonly usedMs: number;
  /** Local day, any numbering. */
  readonly day: number;
  /** SI r.m.s., > 0. */
  readonly level: number;
}

export const baselineRules = {
  provisionalDays: 7,
  learnedDays: 30,
  refinedDays: 60,
  /** Share of a full day's readings below which a day does not count as a running day of the baseline. */
  leastOfDay: 0.25,
  /** ln: day to day 10 % and hour to hour 4 % together. */
  leastSpread: 0.11,
  /** Growth while learning that refuses it, and its two-sided significance. */
  growth: 1.25,
  significance: 0.01,
} as const;

export interface BaselineQuestion {
  readonly levels: readonly GoodLevel[];
  /** Recordings expected on a full day. */
  readonly expectedADay: number;
  /** Where zone C begins, SI r.m.s.; null: there is no zone for this band. */
  readonly zoneC: number | null;
  readonly confirmed: Baseline['confirmed'];
}

/** The baseline that these levels give. Levels beyond the last day that refines it take no part. */
export function baselineOf(question: BaselineQuestion): Baseline {
  const days = runningDays(question).slice(0, baselineRules.refinedDays);
  const levels = days.flat();
  const { confirmed } = question;
  const [first, last] = [levels.at(0), levels.at(-1)];
  if (first === undefined || last === undefined) return { ...noBaseline, confirmed };
  const logs = Float64Array.from(levels, ({ level }) => Math.log(level));
  const own = madToDeviation * medianAbsoluteDeviation(logs);
  const state = stateOf(days.length);
  const isShort = state === 'learning' || state === 'provisional';
  const medianLog = median(logs);
  const refused = confirmed === null ? refusalOf(days, medianLog, question.zoneC) : null;
  return {
    state: refused === null ? state : 'refused',
    fromMs: first.usedMs,
    toMs: last.usedMs,
    runningDays: days.length,
    recordings: levels.length,
    medianLog,
    spreadLog: isShort ? Math.max(own, baselineRules.leastSpread) : own,
    refused,
    confirmed,
  };
}

export const noBaseline: Baseline = {
  state: 'learning',
  fromMs: null,
  toMs: null,
  runningDays: 0,
  recordings: 0,
  medianLog: null,
  spreadLog: null,
  refused: null,
  confirmed: null,
};

/** Whether limits may be reckoned from it. */
export function isUsable(baseline: Baseline | null): baseline is Baseline & {
  readonly medianLog: number;
  readonly spreadLog: number;
} {
  if (baseline === null || baseline.medianLog === null || baseline.spreadLog === null) return false;
  return baseline.state !== 'learning' && baseline.state !== 'refused';
}

/** Whether new recordings may still change it. */
export function isOpen(state: BaselineState): boolean {
  return state !== 'refined' && state !== 'frozen';
}

function stateOf(days: number): BaselineState {
  if (days < baselineRules.provisionalDays) return 'learning';
  if (days < baselineRules.learnedDays) return 'provisional';
  return days < baselineRules.refinedDays ? 'learned' : 'refined';
}

/** Days with enough good recordings, each with its levels. */
function runningDays({ levels, expectedADay }: BaselineQuestion): GoodLevel[][] {
  const days = new Map<number, GoodLevel[]>();
  for (const level of levels) {
    if (!(level.level > 0)) continue;
    const day = days.get(level.day);
    if (day === undefined) days.set(level.day, [level]);
    else day.push(level);
  }
  // A condition that a machine runs in for three hours a day is learned from those: a full day there has three.
  const usual = quantile(
    [...days.values()].map((day) => day.length),
    0.9,
  );
  const least = Math.max(1, Math.ceil(baselineRules.leastOfDay * Math.min(expectedADay, usual)));
  return [...days.values()].filter((day) => day.length >= least);
}

function refusalOf(days: readonly GoodLevel[][], medianLog: number, zoneC: number | null): string | null {
  if (zoneC !== null && medianLog > Math.log(zoneC)) return 'it lies in zone C or D';
  if (days.length < baselineRules.provisionalDays) return null;
  const logs = days.map((day) => Math.log(median(day.map(({ level }) => level))));
  const at = logs.map((_, day) => day);
  const line = theilSen(at, logs, 1);
  if (line === null) return null;
  const growth = Math.exp(line.slope * (days.length - 1));
  if (growth < baselineRules.growth) return null;
  const beside = logs.map((log, day) => log - line.intercept - line.slope * day);
  const { p } = mannKendall(logs, dependenceFactor(beside));
  if (p >= baselineRules.significance) return null;
  return `it rose by ${Math.round(100 * (growth - 1))} % while it was learned`;
}
