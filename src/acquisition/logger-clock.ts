/**
 * A logger's clock must never blind a point.
 *
 * Loggers are set back to 1970 at a power cycle, jump by hours, run a day ahead. If the service only compared a
 * recording's stated start with the newest one it holds, every recording after such a jump would be "late" and none
 * would ever be judged again. So each source has an offset, and everything downstream knows only
 *
 *     used = stated + offset
 *
 * A clock trouble begins, with an offset that puts the newest of the batch at its arrival (spacing kept, used never
 * going back), when a recording would be used
 *   (a) more than the tolerance after its arrival,
 *   (b) earlier than the newest, within half an interval of one that is already there,
 *   (c) earlier than the newest, while nothing of its points was evaluated for their overdue span.
 * It ends when a recording states a time within one interval before its arrival and after the newest used time.
 * Any other recording that is earlier than the newest is late: stored, but it changes no state.
 *
 * Invariant: while files of a point arrive, one is evaluated in every overdue span.
 */
export interface SourceClock {
  readonly offsetMs: number;
  /** Newest used time of an evaluated recording; null before the first. */
  readonly newestUsedMs: number | null;
  /** Arrival of the newest evaluated recording. */
  readonly lastEvaluatedArrivedMs: number | null;
}

export interface ClockQuestion {
  readonly statedMs: number;
  readonly arrivedMs: number;
  /** Newest stated time among the files of this source that wait together. */
  readonly batchNewestStatedMs: number;
  readonly intervalMs: number;
  readonly overdueAfterMs: number;
  readonly toleranceMs: number;
  /** Used time nearest to (stated + offset) among recordings of this source that are already there; null: none. */
  readonly nearestUsedMs: number | null;
}

export interface ClockAnswer {
  readonly usedMs: number;
  readonly offsetMs: number;
  /** Late: kept, but it changes no state. */
  readonly late: boolean;
  readonly trouble: 'none' | 'begins' | 'stands' | 'ends';
  /** For the flag of this recording while the clock is in trouble. */
  readonly flag: 'clock-ahead' | 'clock-set-back' | null;
}

export function readLoggerClock(clock: SourceClock, question: ClockQuestion): ClockAnswer {
  const { statedMs, arrivedMs, intervalMs, toleranceMs } = question;
  const newest = clock.newestUsedMs;
  const saysRightAgain =
    clock.offsetMs !== 0 &&
    statedMs <= arrivedMs + toleranceMs &&
    statedMs > arrivedMs - intervalMs - toleranceMs &&
    (newest === null || statedMs > newest);
  if (saysRightAgain) return { usedMs: statedMs, offsetMs: 0, late: false, trouble: 'ends', flag: null };

  const usedMs = statedMs + clock.offsetMs;
  const standing = clock.offsetMs === 0 ? 'none' : 'stands';
  const standingFlag = clock.offsetMs === 0 ? null : flagOf(clock.offsetMs);
  const ahead = usedMs > arrivedMs + toleranceMs;
  const earlier = newest !== null && usedMs <= newest;
  if (!ahead && !earlier) {
    return { usedMs, offsetMs: clock.offsetMs, late: false, trouble: standing, flag: standingFlag };
  }
  const collides =
    question.nearestUsedMs !== null && Math.abs(question.nearestUsedMs - usedMs) <= intervalMs / 2;
  const blind =
    clock.lastEvaluatedArrivedMs !== null &&
    arrivedMs - clock.lastEvaluatedArrivedMs > question.overdueAfterMs;
  if (ahead || collides || blind) {
    const offsetMs = newOffset(clock, question);
    return { usedMs: statedMs + offsetMs, offsetMs, late: false, trouble: 'begins', flag: flagOf(offsetMs) };
  }
  return { usedMs, offsetMs: clock.offsetMs, late: true, trouble: standing, flag: standingFlag };
}

/** Puts the newest of the batch at its arrival, keeps the spacing, and never lets used time go back. */
function newOffset(clock: SourceClock, question: ClockQuestion): number {
  const atArrival = question.arrivedMs - Math.max(question.batchNewestStatedMs, question.statedMs);
  if (clock.newestUsedMs === null) return atArrival;
  return Math.max(atArrival, clock.newestUsedMs + 1 - question.statedMs);
}

function flagOf(offsetMs: number): 'clock-ahead' | 'clock-set-back' {
  return offsetMs < 0 ? 'clock-ahead' : 'clock-set-back';
}
