import { dependenceFactor, mannKendall, theilSen } from '../signal/rank-trend.ts';
import { deviationOfSorted, madToDeviation, medianOfSorted, quantile } from '../signal/statistics.ts';

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
export function baselineOf({ levels, ...rules }: BaselineQuestion): Baseline {
  const growing = new GrowingBaseline(rules);
  for (const level of levels) growing.add(level);
  return growing.now();
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

/** A day with good recordings. */
interface GoodDay {
  readonly fromMs: number;
  readonly toMs: number;
  /** ln of the levels, ascending. */
  readonly logs: Float64Array;
  /** ln of their median. */
  readonly log: number;
}

/**
 * A baseline level by level. What it is now is answered from the days as they ended, none of them reckoned anew: whoever
 * goes through years asks every day.
 */
export class GrowingBaseline {
  readonly #rules: Omit<BaselineQuestion, 'levels'>;
  readonly #ended: GoodDay[] = [];
  /** The newest day, to which levels may still come. */
  #own: GoodLevel[] = [];
  /** Of the days that count, which are those with so many levels. */
  #least = Number.NaN;
  #days: GoodDay[] = [];
  #logs: Float64Array = new Float64Array(0);
  #looked = 0;

  constructor(rules: Omit<BaselineQuestion, 'levels'>) {
    this.#rules = rules;
  }

  /** Oldest first. */
  add(level: GoodLevel): void {
    if (!(level.level > 0)) return;
    if (this.#own.length > 0 && this.#own[0].day !== level.day) {
      this.#ended.push(goodDay(this.#own));
      this.#own = [];
    }
    this.#own.push(level);
  }

  now(): Baseline {
    const { confirmed, zoneC } = this.#rules;
    const { days, logs } = this.#running();
    const [first, last] = [days.at(0), days.at(-1)];
    if (first === undefined || last === undefined) return { ...noBaseline, confirmed };
    const medianLog = medianOfSorted(logs);
    const own = madToDeviation * deviationOfSorted(logs, medianLog);
    const state = stateOf(days.length);
    const isShort = state === 'learning' || state === 'provisional';
    const refused = confirmed === null ? refusalOf(days, medianLog, zoneC) : null;
    return {
      state: refused === null ? state : 'refused',
      fromMs: first.fromMs,
      toMs: last.toMs,
      runningDays: days.length,
      recordings: logs.length,
      medianLog,
      spreadLog: isShort ? Math.max(own, baselineRules.leastSpread) : own,
      refused,
      confirmed,
    };
  }

  /** Days with enough good recordings, up to the one that refines it, and all their levels. */
  #running(): { readonly days: readonly GoodDay[]; readonly logs: Float64Array } {
    const counts = this.#ended.map(({ logs }) => logs.length);
    // A condition that a machine runs in for three hours a day is learned from those: a full day there has three.
    const usual = quantile([...counts, ...(this.#own.length === 0 ? [] : [this.#own.length])], 0.9);
    const expected = Math.min(this.#rules.expectedADay, usual);
    const least = Math.max(1, Math.ceil(baselineRules.leastOfDay * expected));
    if (least !== this.#least) {
      [this.#least, this.#days, this.#logs, this.#looked] = [least, [], new Float64Array(0), 0];
    }
    for (; this.#looked < this.#ended.length && !this.#isFull(); this.#looked++) {
      const day = this.#ended[this.#looked];
      if (day.logs.length < least) continue;
      this.#days.push(day);
      this.#logs = merged(this.#logs, day.logs);
    }
    if (this.#own.length === 0 || this.#own.length < least || this.#isFull())
      return { days: this.#days, logs: this.#logs };
    const own = goodDay(this.#own);
    return { days: [...this.#days, own], logs: merged(this.#logs, own.logs) };
  }

  #isFull(): boolean {
    return this.#days.length >= baselineRules.refinedDays;
  }
}

function goodDay(levels: readonly GoodLevel[]): GoodDay {
  const sorted = Float64Array.from(levels, ({ level }) => level).sort();
  return {
    fromMs: levels[0].usedMs,
    toMs: levels[levels.length - 1].usedMs,
    logs: sorted.map((level) => Math.log(level)),
    log: Math.log(medianOfSorted(sorted)),
  };
}

function refusalOf(days: readonly GoodDay[], medianLog: number, zoneC: number | null): string | null {
  if (zoneC !== null && medianLog > Math.log(zoneC)) return 'it lies in zone C or D';
  const logs = days.map(({ log }) => log);
  if (days.length < baselineRules.provisionalDays || !mayHaveGrown(logs)) return null;
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

/** A median of all slopes is only so steep where half of them are; counting these needs no order. */
function mayHaveGrown(logs: readonly number[]): boolean {
  const days = logs.length;
  const steep = (Math.log(baselineRules.growth) / (days - 1)) * (1 - 1e-9);
  let count = 0;
  for (let a = 0; a < days; a++) {
    for (let b = a + 1; b < days; b++) if (logs[b] - logs[a] >= steep * (b - a)) count++;
  }
  return 2 * count >= (days * (days - 1)) / 2;
}

function merged(a: Float64Array, b: Float64Array): Float64Array {
  const all = new Float64Array(a.length + b.length);
  for (let n = 0, i = 0, j = 0; n < all.length; n++) all[n] = j >= b.length || a[i] <= b[j] ? a[i++] : b[j++];
  return all;
}
