import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import {
  mostReminders,
  nextReminderMs,
  type ReminderRule,
  reminderDue,
  type ToldSoFar,
} from '../../src/advisory/reminders.ts';

const hourMs = 3_600_000;
const rule = (parts: Partial<ReminderRule> = {}): ReminderRule => ({
  afterMs: hourMs,
  thenTo: [],
  thenAfter: { reminders: 2 },
  ...parts,
});

/** All reminders, each taken by a server as soon as it is due: hours after the first mail, and who has joined. */
function course(one: ReminderRule, delayMs = 0): [number, string][] {
  const all: [number, string][] = [];
  let told: ToldSoFar = { firstMs: 0, lastMs: 0, reminders: 0 };
  for (let dueMs = nextReminderMs(one, told); dueMs !== null; dueMs = nextReminderMs(one, told)) {
    expect(reminderDue(one, told, dueMs - 1)).toBeNull();
    const due = reminderDue(one, told, dueMs);
    if (due === null) throw new Error('not due when it says so');
    expect(due.number).toBe(told.reminders + 1);
    all.push([dueMs / hourMs, due.thenTo.join(' ')]);
    told = { ...told, lastMs: dueMs + delayMs, reminders: due.number };
  }
  return all;
}

describe('reminders', () => {
  it('come after pauses that double up to a day, and end', () => {
    expect(course(rule()).map(([at]) => at)).toEqual([1, 3, 7, 15, 31, 55]);
    expect(course(rule({ afterMs: 4 * hourMs })).map(([at]) => at)).toEqual([4, 12, 28, 52, 76, 100]);
    expect(course(rule({ afterMs: 48 * hourMs })).map(([at]) => at)).toEqual([48, 96, 144, 192, 240, 288]);
  });

  it('count from when a server took the one before', () => {
    expect(
      course(rule(), 2 * hourMs)
        .slice(0, 3)
        .map(([at]) => at),
    ).toEqual([1, 5, 11]);
  });

  it('go to the next recipients after so many, one after the other, until each has had one', () => {
    const joins = course(rule({ thenTo: ['cat', 'dan'] })).map(([, who]) => who);
    expect(joins).toEqual(['', '', 'cat', 'cat dan', 'cat dan', 'cat dan']);
    const many = rule({ thenTo: ['a', 'b', 'c', 'd', 'e', 'f'], thenAfter: { reminders: 1 } });
    expect(
      course(many)
        .map(([, who]) => who)
        .at(-1),
    ).toBe('a b c d e f');
    expect(course(many).length).toBe(7);
  });

  it('go to the next recipient when a time is over, whatever the pause has grown to', () => {
    const one = rule({ afterMs: 4 * hourMs, thenTo: ['cat', 'dan'], thenAfter: { ms: 5 * hourMs } });
    expect(course(one).slice(0, 4)).toEqual([
      [4, ''],
      [5, 'cat'],
      [10, 'cat dan'],
      [34, 'cat dan'],
    ]);
  });

  it('are bounded, ever farther apart unless somebody joins, and tell every next recipient', () => {
    fc.assert(
      fc.property(
        fc.record({
          afterMs: fc.integer({ min: 300_000, max: 30 * 24 * hourMs }),
          thenTo: fc.uniqueArray(fc.constantFrom('a', 'b', 'c', 'd', 'e'), { maxLength: 5 }),
          thenAfter: fc.oneof(
            fc.record({ reminders: fc.integer({ min: 1, max: 10 }) }),
            fc.record({ ms: fc.integer({ min: 300_000, max: 30 * 24 * hourMs }) }),
          ),
        }),
        (one) => {
          const all = course(one);
          expect(all.length).toBe(mostReminders(one));
          expect(all.length).toBeLessThanOrEqual(20);
          if ('reminders' in one.thenAfter) {
            expect(all.at(-1)?.[1]).toBe(one.thenTo.join(' '));
            const pauses = all.map(([at], index) => at - (all[index - 1]?.[0] ?? 0));
            for (const [index, pause] of pauses.slice(1).entries())
              expect(pause).toBeGreaterThanOrEqual((pauses[index] ?? 0) - 1e-6);
          }
          for (const [index, [at, who]] of all.entries()) {
            expect(at).toBeGreaterThan(all[index - 1]?.[0] ?? 0);
            expect(who.startsWith(all[index - 1]?.[1] ?? '')).toBe(true);
          }
        },
      ),
      { seed: 20261201 },
    );
  });
});
