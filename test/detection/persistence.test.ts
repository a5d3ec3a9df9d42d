import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import type { Delay, Severity } from '../../src/config/site.ts';
import type { Condition, Pending } from '../../src/detection/alarm.ts';
import { type Judged, rank } from '../../src/detection/alarm-event.ts';
import { countRecording } from '../../src/detection/persistence.ts';

type Reading = Pick<Judged, 'severity' | 'usedMs' | 'flagged' | 'atOnce'>;
interface Delays {
  readonly onDelay: Delay;
  readonly offDelay: Delay;
}

function counted(readings: readonly Reading[], delays: Delays): Condition[] {
  let state: { condition: Condition; pending: Pending | null } = { condition: 'normal', pending: null };
  return readings.map((reading) => {
    state = countRecording(state, reading, delays);
    return state.condition;
  });
}

/** The slow twin: keeps every recording and looks back through all of them each time. */
function lookedUp(readings: readonly Reading[], { onDelay, offDelay }: Delays, severities: Severity[]) {
  const conditions: Condition[] = [];
  const isLong = (run: readonly Reading[], delay: Delay, now: number): boolean =>
    run.length > 0 &&
    ('recordings' in delay
      ? run.length >= delay.recordings
      : now - Math.min(...run.map(({ usedMs }) => usedMs)) >= delay.ms);
  for (let end = 1; end <= readings.length; end++) {
    const now = readings[end - 1] as Reading;
    const back = readings.slice(0, end).reverse();
    const before: Condition = conditions.at(-1) ?? 'normal';
    const runAbove = (s: Severity): Reading[] => {
      const stop = back.findIndex((r) => rank(r.severity) < rank(s) && !r.flagged);
      return back.slice(0, stop < 0 ? back.length : stop).filter((r) => rank(r.severity) >= rank(s));
    };
    const runBelow = (s: Severity): Reading[] => {
      const stop = back.findIndex((r) => rank(r.severity) >= rank(s));
      return back.slice(0, stop < 0 ? back.length : stop).filter((r) => !r.flagged);
    };
    const reached = severities.filter(
      (s) =>
        rank(s) > rank(before) &&
        rank(now.severity) >= rank(s) &&
        (now.atOnce || isLong(runAbove(s), onDelay, now.usedMs)),
    );
    const held = severities.filter(
      (s) => rank(s) <= rank(before) && (now.flagged || !isLong(runBelow(s), offDelay, now.usedMs)),
    );
    conditions.push(reached.at(-1) ?? held.at(-1) ?? 'normal');
  }
  return conditions;
}

const delay: fc.Arbitrary<Delay> = fc.oneof(
  fc.record({ recordings: fc.integer({ min: 1, max: 5 }) }),
  fc.record({ ms: fc.integer({ min: 0, max: 6 }) }),
);

function readingsOf(severities: readonly Condition[]): fc.Arbitrary<Reading[]> {
  const one = fc.record({
    severity: fc.constantFrom(...severities),
    step: fc.integer({ min: 0, max: 3 }),
    flagged: fc.oneof({ weight: 3, arbitrary: fc.constant(false) }, fc.constant(true)),
    atOnce: fc.oneof({ weight: 9, arbitrary: fc.constant(false) }, fc.constant(true)),
  });
  return fc.array(one, { maxLength: 30 }).map((list) => {
    let usedMs = 0;
    return list.map(({ step, ...reading }) => {
      usedMs += step;
      return { ...reading, usedMs, atOnce: reading.atOnce && reading.severity === 'danger' };
    });
  });
}

describe('on-delay and off-delay', () => {
  it('agree with a twin that looks back through all recordings', () => {
    fc.assert(
      fc.property(readingsOf(['normal', 'alert', 'danger']), delay, delay, (readings, onDelay, offDelay) => {
        const delays = { onDelay, offDelay };
        expect(counted(readings, delays)).toEqual(lookedUp(readings, delays, ['alert', 'danger']));
      }),
      { seed: 20261201, numRuns: 20_000 },
    );
  });

  it('agree with it for trouble, which has one severity', () => {
    fc.assert(
      fc.property(readingsOf(['normal', 'trouble']), delay, delay, (readings, onDelay, offDelay) => {
        const delays = { onDelay, offDelay };
        expect(counted(readings, delays)).toEqual(lookedUp(readings, delays, ['trouble']));
      }),
      { seed: 20261202, numRuns: 3000 },
    );
  });

  const hourly = (...severities: Condition[]): Reading[] =>
    severities.map((severity, i) => ({ severity, usedMs: i * 3_600_000, flagged: false, atOnce: false }));

  it('an alert and a danger in a row are two over the alert limit: alert first, danger with the next', () => {
    const delays = { onDelay: { recordings: 2 }, offDelay: { recordings: 1 } };
    expect(counted(hourly('danger', 'alert', 'danger', 'danger'), delays)).toEqual([
      'normal',
      'alert',
      'alert',
      'danger',
    ]);
  });

  it('an on-delay of 2 h over hourly recordings is done at the third', () => {
    const delays = { onDelay: { ms: 7_200_000 }, offDelay: { ms: 0 } };
    expect(counted(hourly('alert', 'alert', 'alert', 'normal'), delays)).toEqual([
      'normal',
      'normal',
      'alert',
      'normal',
    ]);
  });
});
