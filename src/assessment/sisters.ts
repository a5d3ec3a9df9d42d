import { madToDeviation, median, medianAbsoluteDeviation } from '../signal/statistics.ts';

/**
 * A machine beside machines of its kind that do the same work. What load, weather and season do, they do to all; what is
 * wrong with one shows in its ratio to the others. Daily medians are compared, each day with the same day.
 *
 * Machines of one kind differ for good (foundation, mounting of the sensor), by more than they move. So each is held against
 * what it usually is beside its sisters. It *leaves* them when its ratio to them has grown by more than the sisters' own
 * ratios to each other moved in thirty days, when it lies above them, and when its own level has risen: a sister that fell
 * makes nobody else worse. It is *apart* where it lies above them by more than they differ, whether it came there or always was.
 *
 * Simulated (levels that spread by 10 % from day to day, machines of one kind that differ for good by 20 %; 12,000 bands):
 * none named of which nothing is the matter, beside one, two or three sisters; of levels that doubled five days ago 60, 90 and
 * 93 %, of those that doubled over thirty days 39, 59 and 60 %.
 */
export interface MachineDay {
  /** Local day. */
  readonly day: number;
  /** Median of the day; > 0, any unit that all machines share. */
  readonly level: number;
}

export const sisterRules = {
  windowDays: 30,
  /** Days on which it and its sisters ran, below which nothing is said. */
  leastDays: 10,
  /** Of those the newest, which must all show it. */
  newestDays: 2,
  /** Growth of the ratio below which nothing left, with two sisters or more. */
  leastGrowth: 1.5,
  /** With one sister nobody can say which of the two is odd by a little. */
  leastGrowthOfTwo: 1.8,
  /** Robust deviations of the sisters among themselves. */
  spreads: 3,
  /** Ratio from which it lies above them, and growth of its own level that is one. */
  leastFactor: 1.25,
} as const;

export interface BesideSisters {
  /** The newest day's median over the median of the sisters on that day. */
  readonly ratio: number;
  /** The same on the days before the newest ones. */
  readonly usualRatio: number;
  /** Above them by more than they differ among themselves. */
  readonly isApart: boolean;
  /** Its ratio grew at once, as theirs do not, and its level with it. */
  readonly hasMoved: boolean;
  /** It lies above them, and above what it was: what else a growing ratio needs to count. */
  readonly hasRisen: boolean;
  /** Ratio by the day, oldest first, for a trend. */
  readonly ratios: readonly MachineDay[];
}

interface Logs {
  readonly day: number;
  readonly log: number;
}

/**
 * @param own oldest first
 * @param sisters days of each sister, oldest first; empty ones take no part
 * @returns null where there are too few days to compare
 */
export function besideSisters(
  own: readonly MachineDay[],
  sisters: readonly (readonly MachineDay[])[],
  rules: typeof sisterRules = sisterRules,
): BesideSisters | null {
  const newest = own.at(-1)?.day;
  if (newest === undefined) return null;
  const within = (days: readonly MachineDay[]): Logs[] =>
    days
      .filter(({ day, level }) => level > 0 && day <= newest && day > newest - rules.windowDays)
      .map(({ day, level }) => ({ day, log: Math.log(level) }));
  const others = sisters.map(within).filter((days) => days.length > 0);
  const levels = within(own);
  const ratios = ratiosTo(levels, others);
  if (ratios.length < rules.leastDays || ratios.at(-1)?.day !== newest) return null;
  const split = ratios.length - rules.newestDays;
  const usual = median(ratios.slice(0, split).map(({ log }) => log));
  const now = Math.min(...ratios.slice(split).map(({ log }) => log));
  const [before, last] = [levels.slice(0, -rules.newestDays), levels.slice(-rules.newestDays)];
  const risen = Math.min(...last.map(({ log }) => log)) - median(before.map(({ log }) => log));
  const least = Math.log(rules.leastFactor);
  const growth = Math.log(others.length > 1 ? rules.leastGrowth : rules.leastGrowthOfTwo);
  const hasRisen = now > least && risen > least;
  const grew = hasRisen && now - usual > growth;
  // What costs most is asked for last: most machines are where they were.
  const { moves, differs } = grew || now > growth ? amongThemselves(others) : { moves: 0, differs: 0 };
  return {
    ratio: Math.exp(ratios.at(-1)?.log ?? Number.NaN),
    usualRatio: Math.exp(usual),
    isApart: now > growth && now > rules.spreads * differs,
    hasMoved: grew && now - usual > rules.spreads * moves,
    hasRisen,
    ratios: ratios.map(({ day, log }) => ({ day, level: Math.exp(log) })),
  };
}

/** ln of a machine's level over the median of others on the same day, where at least two of them ran, or the only one. */
function ratiosTo(levels: readonly Logs[], others: readonly (readonly Logs[])[]): Logs[] {
  const byDay = others.map((days) => new Map(days.map(({ day, log }) => [day, log])));
  const needed = Math.min(2, others.length);
  return levels.flatMap(({ day, log }) => {
    const beside = byDay.map((other) => other.get(day)).filter((one) => one !== undefined);
    return needed === 0 || beside.length < needed ? [] : [{ day, log: log - median(beside) }];
  });
}

/**
 * Robust deviations of the sisters' ratios to each other: how much they move about what each usually is, and how much
 * they differ for good. Of a single sister its own movement, for there is no other to hold it against.
 */
function amongThemselves(others: readonly (readonly Logs[])[]): {
  readonly moves: number;
  readonly differs: number;
} {
  const [only] = others;
  if (others.length === 1 && only !== undefined) {
    const moves = madToDeviation * medianAbsoluteDeviation(only.map(({ log }) => log));
    return { moves, differs: moves };
  }
  const ratios = others.map((one) =>
    ratiosTo(
      one,
      others.filter((other) => other !== one),
    ).map(({ log }) => log),
  );
  const about = ratios.flatMap((logs) => {
    const usual = logs.length === 0 ? 0 : median(logs);
    return logs.map((log) => Math.abs(log - usual));
  });
  if (about.length === 0) return { moves: 0, differs: 0 };
  return {
    moves: madToDeviation * median(about),
    differs: madToDeviation * median(ratios.flat().map(Math.abs)),
  };
}
