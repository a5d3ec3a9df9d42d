import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  afterAttempt,
  type EventDue,
  greatestPauseMs,
  groupsDue,
  isWorse,
  mailId,
  messageIdentity,
  nextGroupDueMs,
  pauseMs,
  priorityOf,
  worseSeverity,
} from '../../src/advisory/outbox.ts';
import type { Severity } from '../../src/config/site.ts';

const seed = { seed: 20261201 };
const minuteMs = 60_000;
const times = { gatherMs: 5 * minuteMs, gatherDangerMs: 10_000 };
const severities = ['trouble', 'alert', 'danger'] as const;

const anyEvents = fc
  .array(
    fc.record({
      group: fc.option(fc.constantFrom('fan', 'pump', 'blower'), { nil: null }),
      severity: fc.constantFrom<Severity>(...severities),
      wallMs: fc.integer({ min: 0, max: 20 * minuteMs }),
    }),
    { maxLength: 30 },
  )
  .map((events) => events.map((event, index): EventDue => ({ id: index + 1, ...event })));

describe('gathering', () => {
  it('loses no event and tells none twice: what is not due now is due when the times have passed', () => {
    fc.assert(
      fc.property(anyEvents, fc.integer({ min: 0, max: 20 * minuteMs }), (events, nowMs) => {
        const now = groupsDue(events, nowMs, times).flatMap((group) => group.events.map(({ id }) => id));
        expect(new Set(now).size).toBe(now.length);
        const left = events.filter(({ id }) => !now.includes(id));
        const later = groupsDue(left, nowMs + times.gatherMs, times).flatMap((group) => group.events);
        expect(later.length).toBe(left.length);
      }),
      seed,
    );
  });

  it('puts together what is of one machine, with its worst severity; the most urgent group comes first', () => {
    fc.assert(
      fc.property(anyEvents, (events) => {
        const groups = groupsDue(events, 40 * minuteMs, times);
        expect(new Set(groups.map(({ group }) => group)).size).toBe(groups.length);
        for (const group of groups) {
          const own = events.filter((one) => one.group === group.group);
          expect(group.events.map(({ id }) => id)).toEqual(own.map(({ id }) => id));
          expect(group.severity).toBe(own.map(({ severity }) => severity).reduce(worseSeverity));
        }
        for (const [index, group] of groups.slice(1).entries())
          expect(isWorse(group.severity, groups[index]?.severity ?? 'danger')).toBe(false);
      }),
      seed,
    );
  });

  it('says when to look again, and then something is due', () => {
    fc.assert(
      fc.property(anyEvents, (events) => {
        const at = nextGroupDueMs(events, times);
        if (at === null) {
          expect(events).toEqual([]);
          return;
        }
        expect(groupsDue(events, at, times).length).toBeGreaterThan(0);
        const first = Math.max(...events.map(({ wallMs }) => wallMs));
        // Events from the time to come (a clock that was set back) are due at once.
        if (first <= at - 1) expect(groupsDue(events, at - 1, times)).toEqual([]);
      }),
      seed,
    );
  });

  it('danger waits ten seconds, the rest five minutes, and takes along what has gathered', () => {
    const event = (id: number, severity: Severity, wallMs: number): EventDue => ({
      id,
      group: 'fan',
      severity,
      wallMs,
    });
    expect(groupsDue([event(1, 'alert', 0)], 5 * minuteMs - 1, times)).toEqual([]);
    expect(groupsDue([event(1, 'alert', 0)], 5 * minuteMs, times).length).toBe(1);
    const both = [event(1, 'alert', 0), event(2, 'danger', 1000)];
    expect(groupsDue(both, 10_999, times)).toEqual([]);
    expect(groupsDue(both, 11_000, times)[0]).toMatchObject({ severity: 'danger', events: both });
  });

  it('what is held makes no mail leave before its time, but leaves with one that does', () => {
    const held: EventDue = { id: 1, group: 'fan', severity: 'alert', wallMs: 0, heldUntilMs: 60 * minuteMs };
    expect(groupsDue([held], 60 * minuteMs - 1, times)).toEqual([]);
    expect(nextGroupDueMs([held], times)).toBe(60 * minuteMs);
    expect(groupsDue([held], 60 * minuteMs, times).length).toBe(1);
    const danger: EventDue = { id: 2, group: 'fan', severity: 'danger', wallMs: 30 * minuteMs };
    expect(groupsDue([held, danger], 30 * minuteMs + 10_000, times)[0]?.events).toEqual([held, danger]);
    // A clock that was set back behind its time does not make it leave.
    expect(groupsDue([{ ...held, wallMs: 50 * minuteMs }], 20 * minuteMs, times)).toEqual([]);
  });

  it('a group may gather longer than usual; a danger in it does not', () => {
    const event = (severity: Severity): EventDue => ({
      id: 1,
      group: 'flood:1',
      severity,
      wallMs: 0,
      gatherMs: 60 * minuteMs,
    });
    expect(groupsDue([event('alert')], 60 * minuteMs - 1, times)).toEqual([]);
    expect(groupsDue([event('alert')], 60 * minuteMs, times).length).toBe(1);
    expect(groupsDue([event('danger')], 10_000, times).length).toBe(1);
  });
});

describe('an attempt', () => {
  const anyDelivery = fc.record({
    createdMs: fc.integer({ min: 0, max: 1e9 }),
    danger: fc.boolean(),
    tries: fc.nat(1000),
  });
  const anyAnswer = fc.record({
    kind: fc.constantFrom('accepted', 'later', 'never'),
    answer: fc.string(),
  });

  it('leads to one state for every answer at every time, and is counted', () => {
    fc.assert(
      fc.property(anyDelivery, anyAnswer, fc.integer({ min: 0, max: 2e9 }), (delivery, answer, nowMs) => {
        const next = afterAttempt(delivery, answer, nowMs);
        const states = { accepted: 'accepted', later: 'waiting', never: 'failed' } as const;
        expect(next.state).toBe(states[answer.kind]);
        expect(next.tries).toBe(delivery.tries + 1);
        expect(next.lastAnswer).toBe(answer.answer);
        expect(next.dueMs).toBeGreaterThanOrEqual(nowMs);
      }),
      seed,
    );
  });

  it('is repeated after a pause between a least and a greatest, whatever the clock did; for danger sooner', () => {
    fc.assert(
      fc.property(anyDelivery, fc.integer({ min: 0, max: 2e9 }), (delivery, nowMs) => {
        const pause = pauseMs(delivery, nowMs);
        expect(pause).toBeGreaterThanOrEqual(delivery.danger ? 15_000 : minuteMs);
        expect(pause).toBeLessThanOrEqual(delivery.danger ? 5 * minuteMs : greatestPauseMs);
        expect(pauseMs({ ...delivery, danger: true }, nowMs)).toBeLessThanOrEqual(pause);
      }),
      seed,
    );
  });

  it('is repeated at 1, 2, 4, 8, ... minutes of age, so that a day of silence costs about thirty attempts', () => {
    let nowMs = 0;
    const ages: number[] = [];
    while (nowMs < 86_400_000) {
      nowMs = afterAttempt(
        { createdMs: 0, danger: false, tries: 0 },
        { kind: 'later', answer: '' },
        nowMs,
      ).dueMs;
      ages.push(nowMs / minuteMs);
    }
    expect(ages.slice(0, 7)).toEqual([1, 2, 4, 8, 16, 32, 64]);
    expect(ages.length).toBe(30);
  });
});

describe('names', () => {
  it('of a message hang on what it tells; of a mail on the recipient too, but not on how he is spelt', () => {
    const identity = messageIdentity('ledger', 'alarm', ['a', 'b']);
    expect(messageIdentity('ledger', 'alarm', ['a', 'b'])).toBe(identity);
    const others = [
      messageIdentity('other', 'alarm', ['a', 'b']),
      messageIdentity('ledger', 'catch-up', ['a', 'b']),
      messageIdentity('ledger', 'alarm', ['a']),
      messageIdentity('ledger', 'alarm', ['ab']),
    ];
    expect(new Set([identity, ...others]).size).toBe(5);
    const id = mailId(identity, 'ann@larkfen.example', 'Humledger <humledger@larkfen.example>');
    expect(id).toMatch(/^<[0-9a-f]{40}@larkfen\.example>$/);
    expect(mailId(identity, 'Ann@Larkfen.example', 'humledger@larkfen.example')).toBe(id);
    expect(mailId(identity, 'ben@larkfen.example', 'humledger@larkfen.example')).not.toBe(id);
    expect(mailId(identity, 'ann@larkfen.example', 'no address')).toMatch(/@humledger\.invalid>$/);
  });
});

it('danger leaves before alarms, alarms before word of the service, summaries last', () => {
  const order = [
    priorityOf('alarm', 'danger'),
    priorityOf('alarm', 'alert'),
    priorityOf('service', null),
    priorityOf('summary', null),
  ];
  expect([...order].sort((a, b) => a - b)).toEqual(order);
  expect(new Set(order).size).toBe(4);
});
