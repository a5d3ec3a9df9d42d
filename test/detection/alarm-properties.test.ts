import fc from 'fast-check';
import { expect, it } from 'vitest';
import { type AlarmState, normalState } from '../../src/detection/alarm.ts';
import {
  type AlarmEvent,
  type AlarmRule,
  alarmCommands,
  type Judged,
  rank,
} from '../../src/detection/alarm-event.ts';
import { alarmStep, heldStanding } from '../../src/detection/alarm-state.ts';
import { brokenInvariants } from './alarm-invariants.ts';

/** Random lives of an alarm. fast-check prints the seed and the smallest failing case. */
const run = { seed: 20261201, numRuns: 3000 };
const hour = 3_600_000;

const delay = fc.oneof(
  fc.record({ recordings: fc.integer({ min: 1, max: 4 }) }),
  fc.record({ ms: fc.integer({ min: 0, max: 4 }).map((hours) => hours * hour) }),
);
const rule: fc.Arbitrary<AlarmRule> = fc.record({
  side: fc.constantFrom('upper', 'lower'),
  onDelay: delay,
  offDelay: delay,
  latching: fc.boolean(),
  sayAgainPercent: fc.constantFrom(null, 5, 25),
});
const judged = fc.record({
  kind: fc.constant('judged' as const),
  severity: fc.constantFrom('normal', 'alert', 'danger'),
  usedMs: fc.integer({ min: -1, max: 2 }).map((hours) => hours * hour),
  level: fc.option(fc.double({ min: 0, max: 10, noNaN: true })),
  flagged: fc.boolean(),
  atOnce: fc.boolean(),
  reason: fc.constant({}),
});
const command = fc.record({
  kind: fc.constantFrom(...alarmCommands),
  comment: fc.constant(null),
  reason: fc.constant({}),
});
/** `usedMs` is a step here, made a time by `lifeOf`; now and then it goes back. */
const events = fc.array(fc.oneof({ weight: 3, arbitrary: judged }, command), { maxLength: 60 });

function* lifeOf(sequence: readonly AlarmEvent[], by: AlarmRule) {
  let before: AlarmState = normalState;
  let now = 0;
  for (const one of sequence) {
    if (one.kind === 'judged') now += one.usedMs;
    const event: AlarmEvent =
      one.kind === 'judged' ? { ...one, usedMs: now, atOnce: one.atOnce && one.severity === 'danger' } : one;
    const step = alarmStep(before, event, by);
    yield { before, event, step };
    before = step.state;
  }
}

it('no sequence of events breaks an invariant', () => {
  fc.assert(
    fc.property(events, rule, (sequence, by) => {
      for (const { before, event, step } of lifeOf(sequence, by)) {
        expect(brokenInvariants(before, event, step)).toEqual([]);
      }
    }),
    run,
  );
});

it('a danger that people were told of is never lost: it waits until acknowledged or its limit is removed', () => {
  let owedSteps = 0;
  fc.assert(
    fc.property(events, rule, (sequence, by) => {
      let owed = false;
      for (const { event, step } of lifeOf(sequence, by)) {
        if (event.kind === 'acknowledge' || event.kind === 'limit-removed') owed = false;
        if (step.tell?.severity === 'danger' && event.kind !== 'limit-removed') owed = true;
        if (!owed) continue;
        owedSteps++;
        expect(heldStanding(step.state)).toMatch(/unacknowledged$/);
        expect(step.state.highest).toBe('danger');
      }
    }),
    run,
  );
  expect(owedSteps).toBeGreaterThan(1000);
});

it('a danger limit that is removed while unacknowledged is told at once, unless suppressed', () => {
  for (const suppressed of [false, true]) {
    const sequence: AlarmEvent[] = [
      { kind: 'judged', severity: 'danger', usedMs: 0, level: 5, flagged: false, atOnce: true, reason: {} },
      ...(suppressed ? [{ kind: 'shelve', comment: null, reason: {} } as const] : []),
      { kind: 'limit-removed', comment: null, reason: {} },
    ];
    const by: AlarmRule = {
      side: 'upper',
      onDelay: { recordings: 3 },
      offDelay: { recordings: 1 },
      latching: false,
      sayAgainPercent: null,
    };
    const last = [...lifeOf(sequence, by)].at(-1);
    expect(last?.step.tell?.event ?? null).toBe(suppressed ? null : 'limit-removed');
    expect(last?.step.state).toMatchObject({ highest: null, suppressions: [], condition: 'normal' });
  }
});

it('a flagged recording never lowers a condition, and leaving out flagged lows changes nothing', () => {
  const recordings = fc.array(judged, { maxLength: 40 });
  const conditions = (sequence: readonly Judged[], by: AlarmRule) =>
    [...lifeOf(sequence, by)].map(({ step }) => step.state.condition);
  fc.assert(
    fc.property(recordings, rule, (sequence, by) => {
      for (const { before, event, step } of lifeOf(sequence, by)) {
        if (event.kind === 'judged' && event.flagged) {
          expect(rank(step.state.condition)).toBeGreaterThanOrEqual(rank(before.condition));
        }
      }
      // Steps of time stay in, so that the delays in time are the same.
      const timed = sequence.map((one) => ({ ...one, usedMs: hour }));
      const byCount = {
        ...by,
        onDelay: { recordings: 2 },
        offDelay: { recordings: 2 },
      };
      const isFlaggedLow = (one: Judged) => one.flagged && one.severity === 'normal';
      const all = conditions(timed, byCount).filter((_, i) => !isFlaggedLow(timed[i] as Judged));
      expect(
        conditions(
          timed.filter((one) => !isFlaggedLow(one)),
          byCount,
        ),
      ).toEqual(all);
    }),
    run,
  );
});

it('every alarm that stands without a suppression was told', () => {
  fc.assert(
    fc.property(events, rule, (sequence, by) => {
      let toldRank = 0;
      for (const { step } of lifeOf(sequence, by)) {
        if (step.state.condition === 'normal') toldRank = 0;
        if (step.tell !== null) toldRank = Math.max(toldRank, rank(step.tell.severity));
        if (step.state.suppressions.length > 0) continue;
        expect(toldRank).toBeGreaterThanOrEqual(rank(step.state.condition));
      }
    }),
    run,
  );
});
