import fc from 'fast-check';
import { describe, expect, it, test } from 'vitest';
import { type AlarmState, type AlarmSubject, normalState, subjectKey } from '../../src/detection/alarm.ts';
import { type AlarmEvent, type AlarmRule, alarmCommands } from '../../src/detection/alarm-event.ts';
import {
  chatterOf,
  heldAsChattering,
  isLongStanding,
  longStandingMs,
} from '../../src/detection/alarm-history.ts';
import { alarmStep, heldStanding } from '../../src/detection/alarm-state.ts';
import {
  followSuppressions,
  heldByDesign,
  type PlantNow,
  ruleOfCommands,
  type SuppressionsDue,
  statesUnder,
  withBrought,
} from '../../src/detection/suppression.ts';

const subject: AlarmSubject = {
  kind: 'limit',
  machineId: 'pump-2',
  pointId: 'de-v',
  bandId: 'overall',
  limitId: 'overall-fixed-upper',
};
const because = { comment: null, reason: {} };
const rule: AlarmRule = {
  side: 'upper',
  onDelay: { recordings: 1 },
  offDelay: { recordings: 1 },
  latching: false,
  sayAgainPercent: 25,
};
const judged = fc.record({
  kind: fc.constant('judged' as const),
  severity: fc.constantFrom('normal' as const, 'alert' as const, 'danger' as const),
  usedMs: fc.constant(0),
  level: fc.double({ min: 0, max: 10, noNaN: true }),
  flagged: fc.boolean(),
  atOnce: fc.constant(false),
  reason: fc.constant({}),
});
const command = fc.record({
  kind: fc.constantFrom(...alarmCommands),
  comment: fc.constant(null),
  reason: fc.constant({}),
});
const events: fc.Arbitrary<AlarmEvent[]> = fc.array(fc.oneof({ weight: 2, arbitrary: judged }, command), {
  maxLength: 40,
});
const due: fc.Arbitrary<SuppressionsDue> = fc.record({
  outOfService: fc.option(fc.constant(because)),
  byDesign: fc.option(fc.constant(because)),
});

describe('what is due', () => {
  it('is followed from every state: no more, no less, told once at most and only when nothing holds any more', () => {
    fc.assert(
      fc.property(events, fc.boolean(), due, (sequence, latching, wanted) => {
        const by = { ...rule, latching };
        const before = sequence.reduce((state, event) => alarmStep(state, event, by).state, normalState);
        const changes = followSuppressions(subject, before, wanted);
        const after = changes.at(-1)?.state ?? before;
        expect(after.suppressions.includes('out-of-service')).toBe(wanted.outOfService !== null);
        expect(after.suppressions.includes('by-design')).toBe(wanted.byDesign !== null);
        expect(after.suppressions.includes('shelved')).toBe(before.suppressions.includes('shelved'));
        expect(changes.map(({ state }) => state.version)).toEqual(
          changes.map((_, n) => before.version + n + 1),
        );
        const told = changes.filter(({ tell }) => tell !== null);
        expect(told.length).toBeLessThanOrEqual(1);
        if (told.length === 1) expect(after.suppressions).toEqual([]);
        expect(followSuppressions(subject, after, wanted)).toEqual([]);
        // Nothing that was told and unacknowledged is lost on the way.
        if (before.told !== null && !before.acknowledged)
          expect(heldStanding(after)).toMatch(/unacknowledged$/);
      }),
      { seed: 20261201, numRuns: 2000 },
    );
  });

  it('comes before the first change of its subject, and only where there is one', () => {
    const under = statesUnder([subject], new Map(), () => ({ outOfService: because, byDesign: null }));
    const key = subjectKey(subject);
    expect(under.states.get(key)?.suppressions).toEqual(['out-of-service']);
    expect(withBrought(under, [], [])).toEqual([[], []]);
    const state = under.states.get(key) as AlarmState;
    const change = { subject, state: { ...state, version: 2 }, journal: [], tell: null };
    const [first, second] = withBrought(under, [change], [change]);
    expect(first?.map(({ state: one }) => one.version)).toEqual([1, 2]);
    expect(second).toEqual([change]);
  });

  test('by design holds while one condition does; what is not known holds nothing back', () => {
    const plant: PlantNow = {
      stateOf: (machineId) => (machineId === 'fan' ? 'stopped' : null),
      hasTrouble: (machineId, pointId) => machineId === 'blower' && pointId === 'de-h',
    };
    const held = (text: 'fan' | 'mixer', state: 'stopped' | 'running') =>
      heldByDesign([{ by: 'machine', machineId: text, state }], plant)?.reason;
    expect(held('fan', 'stopped')).toEqual({ while: 'fan stopped' });
    expect(held('fan', 'running')).toBeUndefined();
    expect(held('mixer', 'stopped')).toBeUndefined();
    const trouble = { by: 'trouble', machineId: 'blower', pointId: 'de-h' } as const;
    expect(heldByDesign([{ ...trouble, pointId: 'nde-h' }, trouble], plant)?.reason).toEqual({
      while: 'trouble of blower/de-h',
    });
    expect(heldByDesign([], plant)).toBeNull();
  });
});

describe('an alarm that comes and goes', () => {
  const event = (name: 'raised' | 'returned', usedMs: number, reason = {}) => ({
    event: name,
    usedMs,
    reason,
  });
  const newestFirst = [
    event('returned', 60),
    event('raised', 50),
    event('returned', 40),
    event('raised', 30),
    event('returned', 20),
    event('raised', 10),
  ];

  test('chatters from three returns within the recordings that count', () => {
    expect(chatterOf(newestFirst, 20)).toEqual({ returns: 3, told: false });
    expect(chatterOf(newestFirst, 21)).toBeNull();
    expect(chatterOf([event('raised', 70, { chattering: {} }), ...newestFirst], 0)).toMatchObject({
      told: true,
    });
  });

  test('is held back once that was told; never what stands and was told, never a danger', () => {
    const told = { returns: 3, told: true };
    expect(heldAsChattering(told, normalState)?.reason.while).toBe(
      'it comes and goes: 3 returns within 24 recordings',
    );
    expect(heldAsChattering({ ...told, told: false }, normalState)).toBeNull();
    expect(heldAsChattering(null, normalState)).toBeNull();
    expect(heldAsChattering(told, { condition: 'alert', suppressions: [] })).toBeNull();
    expect(heldAsChattering(told, { condition: 'alert', suppressions: ['by-design'] })).not.toBeNull();
    expect(heldAsChattering(told, { condition: 'danger', suppressions: ['by-design'] })).toBeNull();
  });
});

test('an alarm stands for long after more than two weeks, in whatever state of acknowledgement', () => {
  const standing = { condition: 'alert', sinceMs: 0 } as const;
  expect(isLongStanding(standing, longStandingMs)).toBe(false);
  expect(isLongStanding(standing, longStandingMs + 1)).toBe(true);
  expect(isLongStanding({ ...standing, condition: 'normal' }, 1e12)).toBe(false);
});

test('an alarm that comes again before anybody acknowledged it stands since then', () => {
  const rule: AlarmRule = { ...ruleOfCommands, sayAgainPercent: null };
  const hourMs = 3_600_000;
  const state = [1, 0, 1, 1].reduce((before, over, n) => {
    const usedMs = n < 2 ? n * hourMs : longStandingMs + n * hourMs;
    const severity = over === 1 ? 'alert' : 'normal';
    const judged = { kind: 'judged', severity, usedMs, level: 3, flagged: false, atOnce: false, reason: {} };
    return alarmStep(before, judged as AlarmEvent, rule).state;
  }, normalState);
  expect(state).toMatchObject({ condition: 'alert', sinceMs: longStandingMs + 2 * hourMs, count: 2 });
  expect(isLongStanding(state, longStandingMs + 4 * hourMs)).toBe(false);
});
