import { differenceUnit, inDisplayUnit } from '../config/print-value.ts';
import type { DisplayUnit, Limit } from '../config/site.ts';

/** What of a limit is moved: the level of its alert or danger, or what the level follows from. */
export type MovedValue = 'alert' | 'danger' | 'k' | 'multiple' | 'change' | 'growth';

export interface WantedLimit {
  readonly moves: MovedValue;
  /** As in the site file: SI r.m.s. for alert, danger and change, else a bare number. */
  readonly now: number;
  /** The value nearest to what is usual that would not have come more often than wanted; null: none would. */
  readonly value: number | null;
  /** Alarms with that value. */
  readonly count: number | null;
}

/** Steps of 5 % from the value as it is: an eighth of it, and twenty times as much. */
const stepRatio = 1.05;
const stepsTighter = 42;
const stepsLooser = 62;

/** How a limit would have done. */
export interface Counted {
  readonly count: number;
  /** For how long it would have stood. */
  readonly inAlarmMs: number;
}

/**
 * The value of a limit that would have given an alarm no more than `most` times, by rehearsing it again and again. It is
 * one that can be written into the site file as it is shown. A tighter one is answered only as long as the alarm does
 * not stand for longer than it does now or `oftenMs`: a limit below what is usual comes once and stays.
 *
 * @param now how the limit did as it is; whoever rehearses another may end as soon as it is worse than wanted
 * @returns null where the limit has no single value to move: zones come from their table, a curve has many
 */
export function wantedLimit(
  limit: Limit,
  display: DisplayUnit,
  wanted: { readonly most: number; readonly oftenMs: number },
  now: Counted,
  rehearsed: (limit: Limit, longestMs: number) => Counted,
): WantedLimit | null {
  const moved = movedBy(limit, display);
  if (moved === null) return null;
  const longestMs =
    now.count <= wanted.most ? Math.max(wanted.oftenMs, now.inAlarmMs) : Number.POSITIVE_INFINITY;
  const known = new Map<number, Counted>([[0, now]]);
  const at = (step: number): Counted => {
    const counted = known.get(step) ?? rehearsed(moved.with(moved.step(step)), longestMs);
    known.set(step, counted);
    return counted;
  };
  const fits = (step: number) => at(step).count <= wanted.most && at(step).inAlarmMs <= longestMs;
  const { moves } = moved;
  const answer = (step: number) => ({
    moves,
    now: moved.now,
    value: moved.step(step),
    count: at(step).count,
  });
  if (fits(0)) {
    let tighter = 1;
    while (tighter < stepsTighter && fits(-tighter)) tighter *= 2;
    return answer(lastThatFits(0, -Math.min(tighter, stepsTighter), fits));
  }
  const loosest = moved.loosest(stepsLooser);
  if (!fits(loosest)) return { moves, now: moved.now, value: null, count: null };
  return answer(lastThatFits(loosest, 0, fits));
}

/** The step that fits nearest to `bad`, which does not, from `good`, which does. Whatever is answered was found to fit. */
function lastThatFits(good: number, bad: number, fits: (step: number) => boolean): number {
  if (fits(bad)) return bad;
  let [from, to] = [good, bad];
  while (Math.abs(from - to) > 1) {
    const middle = Math.trunc((from + to) / 2);
    if (fits(middle)) from = middle;
    else to = middle;
  }
  return from;
}

interface Moved {
  readonly moves: MovedValue;
  readonly now: number;
  /** The value so many steps looser; the value as it is at 0. */
  step(steps: number): number;
  /** Steps that the limit's other values leave room for. */
  loosest(steps: number): number;
  with(value: number): Limit;
}

function movedBy(limit: Limit, display: DisplayUnit): Moved | null {
  const { rule } = limit;
  if (rule === undefined || rule.by === 'stands')
    return limit.kind === 'zone' ? null : movedLevel(limit, display);
  switch (rule.by) {
    case 'spread':
      return moved('k', rule.alert, rule.danger, {
        step: (n) => tenth(rule.alert * stepRatio ** n),
        with: (alert) => ({ ...limit, rule: { ...rule, alert } }),
      });
    case 'change':
      return moved('change', rule.alert, null, {
        step: (n) => round(rule.alert * stepRatio ** n, differenceUnit(display)),
        with: (alert) => ({ ...limit, rule: { ...rule, alert } }),
      });
    case 'baseline':
    case 'rate': {
      const { alert } = rule;
      if (alert === null) return null;
      const looser = limit.side === 'upper' || rule.by === 'rate' ? 1 : -1;
      return moved(rule.by === 'rate' ? 'growth' : 'multiple', alert, rule.danger, {
        // Moved is the distance from what is usual: an upper limit never comes to stand below it.
        step: (n) => hundredth(1 + looser * Math.abs(alert - 1) * stepRatio ** n),
        with: (value) => ({ ...limit, rule: { ...rule, alert: value } }),
      });
    }
    case 'curve':
      return null;
  }
}

function movedLevel(limit: Limit, display: DisplayUnit): Moved | null {
  const moves = limit.alert === null ? 'danger' : 'alert';
  const now = limit.alert ?? limit.danger;
  if (now === null) return null;
  const looser = limit.side === 'upper' ? stepRatio : 1 / stepRatio;
  return moved(moves, now, moves === 'alert' ? limit.danger : null, {
    step: (n) => round(now * looser ** n, display),
    with: (value) => ({ ...limit, [moves]: value }),
  });
}

function moved(
  moves: MovedValue,
  now: number,
  danger: number | null,
  { step, with: withValue }: Pick<Moved, 'step' | 'with'>,
): Moved {
  const own = (n: number) => (n === 0 ? now : step(n));
  const isUpper = step(1) > now;
  return {
    moves,
    now,
    step: own,
    with: withValue,
    loosest: (steps) => {
      let most = steps;
      const isPast = (value: number) =>
        value <= 0 || (danger !== null && (isUpper ? value >= danger : value <= danger));
      while (most > 0 && isPast(own(most))) most--;
      return most;
    },
  };
}

/** Three figures in the unit in which it is written; of decibels the tenth. */
function round(si: number, display: DisplayUnit): number {
  const shown = inDisplayUnit(si, display);
  if (display.decibelReference !== undefined) return si * 10 ** ((tenth(shown) - shown) / 20);
  return (si * Number(shown.toPrecision(3))) / shown;
}

function tenth(value: number): number {
  return Math.round(value * 10) / 10;
}

function hundredth(value: number): number {
  return Math.round(value * 100) / 100;
}
