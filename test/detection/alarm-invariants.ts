import type { AlarmState } from '../../src/detection/alarm.ts';
import { type AlarmEvent, type AlarmStep, rank } from '../../src/detection/alarm-event.ts';
import { heldStanding } from '../../src/detection/alarm-state.ts';

/** The invariants of alarm-state.ts, restated from its text and not from its code. Answers the numbers broken. */
export function brokenInvariants(before: AlarmState, event: AlarmEvent, step: AlarmStep): string[] {
  return [...ofState(step.state), ...ofStep(before, event, step)];
}

function ofState(s: AlarmState): string[] {
  const suppressed = s.suppressions.length > 0;
  const none =
    s.condition === 'normal' &&
    !s.acknowledged &&
    !s.latched &&
    s.told === null &&
    !s.heldBack &&
    s.toldLevel === null &&
    s.knownLevel === null;
  const pending = s.pending === null ? [] : [s.pending, ...(s.pending.beside ? [s.pending.beside] : [])];
  const directions = new Set(pending.map(({ to }) => Math.sign(rank(to) - rank(s.condition))));
  const kinds = [s.condition, s.highest, ...pending.map(({ to }) => to)];
  return broken({
    I1: (s.highest === null) === (s.sinceMs === null && s.count === 0) && (s.highest !== null || none),
    I2: rank(s.condition) <= rank(s.highest) && rank(s.told) <= rank(s.highest),
    I7: !s.latched || (s.highest !== null && s.condition === 'normal'),
    I9:
      !directions.has(0) &&
      directions.size <= 1 &&
      !(kinds.includes('trouble') && (kinds.includes('alert') || kinds.includes('danger'))),
    I10: !s.heldBack || (suppressed && (s.condition !== 'normal' || s.latched)),
  });
}

function ofStep(
  before: AlarmState,
  event: AlarmEvent,
  { state, journal, tell, ignored }: AlarmStep,
): string[] {
  const same = state === before;
  const owed = before.told !== null && !before.acknowledged;
  const settled = event.kind === 'acknowledge' || event.kind === 'limit-removed';
  const flagged = event.kind === 'judged' && event.flagged;
  const owing = ['unacknowledged', 'returned-unacknowledged', 'latched-unacknowledged'];
  const moved = before.condition !== state.condition;
  return broken({
    I3: tell === null || state.suppressions.length === 0,
    I4:
      !owed ||
      settled ||
      (owing.includes(heldStanding(state)) && (before.highest !== 'danger' || state.highest === 'danger')),
    I5:
      !flagged ||
      (rank(state.condition) >= rank(before.condition) &&
        longestFall(state) <= longestFall(before) &&
        (moved || longestRise(state) >= longestRise(before))),
    I6:
      (tell === null || !state.acknowledged) &&
      (before.acknowledged || !state.acknowledged || event.kind === 'acknowledge'),
    I8:
      (same ? journal.length === 0 && tell === null : state.version === before.version + 1) &&
      (ignored === null || same) &&
      (before.usedMs === null || (state.usedMs ?? -1) >= before.usedMs),
    I11: !moved || journal.some((e) => e.before === before.condition && e.after === state.condition),
  });
}

function longestFall(s: AlarmState): number {
  return longest(s, (step) => step < 0);
}

function longestRise(s: AlarmState): number {
  return longest(s, (step) => step > 0);
}

function longest(s: AlarmState, wanted: (step: number) => boolean): number {
  return [s.pending, s.pending?.beside ?? null].reduce(
    (most, run) => (run && wanted(rank(run.to) - rank(s.condition)) ? Math.max(most, run.recordings) : most),
    0,
  );
}

function broken(held: Readonly<Record<string, boolean>>): string[] {
  return Object.entries(held).flatMap(([name, holds]) => (holds ? [] : [name]));
}
