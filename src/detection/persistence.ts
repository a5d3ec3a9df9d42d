import type { Delay, Severity } from '../config/site.ts';
import type { AlarmState, Condition, Pending, PendingStep } from './alarm.ts';
import { type AlarmRule, type Judged, rank } from './alarm-event.ts';

/**
 * On-delay and off-delay. Each step of severity is counted by itself, in a run of recordings:
 *
 *   rising to s:   the run of recordings at s or above; done when it is as long as the on-delay
 *   falling below s: the run of recordings below s; done when it is as long as the off-delay
 *
 * so that 'alert, danger' in a row with an on-delay of two recordings raises the alert, and one more danger makes it
 * a danger. A delay in time is done at the first recording that ends the run's span. A flagged recording that reads
 * lower is left out: no run grows, begins or ends by it, because it neither proves that the level came down nor that
 * the one before was a slip. One that reads higher counts as any other. Late recordings and those of a standing
 * machine must not come here.
 */
export interface Counted {
  readonly condition: Condition;
  /** The same object as before when it has not changed. */
  readonly pending: Pending | null;
  /** When the condition rose: the run that began it. */
  readonly begun: PendingStep | null;
}

type Run = PendingStep | null;

/** One recording more: whether the condition changes with it, and the runs that go on. */
export function countRecording(
  state: Pick<AlarmState, 'condition' | 'pending'>,
  judged: Pick<Judged, 'severity' | 'usedMs' | 'flagged' | 'atOnce'>,
  rule: Pick<AlarmRule, 'onDelay' | 'offDelay'>,
): Counted {
  const { condition, pending } = state;
  const rises = stepsAbove(condition, judged.severity, pending).map((to) => {
    if (rank(judged.severity) >= rank(to)) return grown(runTo(pending, to), to, judged.usedMs);
    return judged.flagged ? runTo(pending, to) : null;
  });
  const risen = rises.findLastIndex(
    (run) =>
      run !== null &&
      rank(judged.severity) >= rank(run.to) &&
      (judged.atOnce || isDone(run, rule.onDelay, judged.usedMs)),
  );
  if (risen >= 0) {
    const to = (rises[risen] as PendingStep).to;
    return { condition: to, pending: pack(pending, rises.slice(risen + 1)), begun: rises[0] ?? null };
  }

  const falls = stepsBelow(condition).map(({ below, to }) => {
    if (rank(judged.severity) >= rank(below)) return null;
    return judged.flagged ? runTo(pending, to) : grown(runTo(pending, to), to, judged.usedMs);
  });
  const fallen = judged.flagged
    ? -1
    : falls.findLastIndex((run) => run !== null && isDone(run, rule.offDelay, judged.usedMs));
  if (fallen >= 0) {
    const to = (falls[fallen] as PendingStep).to;
    return { condition: to, pending: pack(pending, falls.slice(fallen + 1)), begun: null };
  }
  return { condition, pending: pack(pending, [...rises, ...falls]), begun: null };
}

/** Severities that could be risen to, nearest first: those of limits, or the one of trouble. */
function stepsAbove(condition: Condition, severity: Condition, pending: Pending | null): readonly Severity[] {
  const steps: readonly Severity[] = [condition, severity, pending?.to].includes('trouble')
    ? ['trouble']
    : ['alert', 'danger'];
  return steps.filter((s) => rank(s) > rank(condition));
}

/** Steps down, nearest first. */
function stepsBelow(condition: Condition): readonly { below: Severity; to: Condition }[] {
  const toNormal = { below: 'alert', to: 'normal' } as const;
  switch (condition) {
    case 'normal':
      return [];
    case 'trouble':
      return [{ below: 'trouble', to: 'normal' }];
    case 'alert':
      return [toNormal];
    case 'danger':
      return [{ below: 'danger', to: 'alert' }, toNormal];
  }
}

function runTo(pending: Pending | null, to: Condition): Run {
  if (pending?.to === to) return { to, sinceMs: pending.sinceMs, recordings: pending.recordings };
  return pending?.beside?.to === to ? pending.beside : null;
}

function grown(run: Run, to: Condition, usedMs: number): PendingStep {
  return run === null ? { to, sinceMs: usedMs, recordings: 1 } : { ...run, recordings: run.recordings + 1 };
}

function isDone(run: PendingStep, delay: Delay, usedMs: number): boolean {
  return 'recordings' in delay ? run.recordings >= delay.recordings : usedMs - run.sinceMs >= delay.ms;
}

/** Nearest first in; farthest first out. Rises and falls are never counted at once, so there are two at most. */
function pack(before: Pending | null, runs: readonly Run[]): Pending | null {
  const [farthest, beside] = runs.filter((run) => run !== null).reverse();
  if (farthest === undefined) return null;
  const after: Pending = { ...farthest, beside: beside ?? null };
  return sameRun(before, after) && sameRun(before?.beside ?? null, after.beside) ? before : after;
}

function sameRun(a: Run, b: Run): boolean {
  return a?.to === b?.to && a?.sinceMs === b?.sinceMs && a?.recordings === b?.recordings;
}
