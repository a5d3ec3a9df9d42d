import { describe, expect, it } from 'vitest';
import { type QualityFlag, qualityFlags } from '../../src/acquisition/recording.ts';
import { type AlarmState, normalState, subjectKey, type TroubleKind } from '../../src/detection/alarm.ts';
import { alarmStep, standing } from '../../src/detection/alarm-state.ts';
import { lowSignal } from '../../src/detection/low-signal.ts';
import {
  looksDead,
  type TroubleSubject,
  troubleRule,
  troubleStep,
  troubleToldInSummary,
} from '../../src/detection/trouble.ts';

const about = (trouble: TroubleKind): TroubleSubject => ({
  kind: 'trouble',
  trouble,
  machineId: null,
  pointId: null,
  source: 'logger-1',
});

/** Looks, one a millisecond; answers the last state and all events. */
function looks(trouble: TroubleKind, present: readonly boolean[]) {
  let state: AlarmState | undefined;
  const events: string[] = [];
  const told: string[] = [];
  for (const [usedMs, found] of present.entries()) {
    const change = troubleStep(about(trouble), state, { present: found, usedMs, reason: { file: usedMs } });
    if (change === null) continue;
    state = change.state;
    events.push(...change.journal.map(({ event }) => event));
    if (change.tell !== null) told.push(change.tell.severity);
  }
  return { state: state ?? normalState, events, told };
}

describe('trouble', () => {
  it.each([
    'overdue',
    'unreadable',
    'unassigned',
    'wrong-rate',
    'uneven-time',
    'repeats-itself',
    'clock',
    'late-sidecar',
    'drop-folder',
    'ledger',
    'mail-refused',
    'site-file',
  ] as const)('%s is raised and told by one look, and returns with the first good one', (kind) => {
    const { state, events, told } = looks(kind, [true, false, false]);
    expect(events).toEqual(['raised', 'returned']);
    expect(told).toEqual(['trouble']);
    expect(standing(state)).toBe('returned-unacknowledged');
  });

  it.each(['dead-sensor', 'reads-stopped'] as const)('%s needs two looks in a row', (kind) => {
    expect(looks(kind, [true, false, true, false]).events).toEqual([]);
    expect(looks(kind, [true, true]).events).toEqual(['raised']);
  });

  it('counts files, but not how often the same silence is looked at', () => {
    expect(looks('unreadable', [true, true, true]).state.count).toBe(3);
    const overdue = looks('overdue', [true, true, true]).state;
    expect([overdue.count, overdue.version]).toEqual([1, 1]);
  });

  it('that was never there stores nothing', () => {
    expect(troubleStep(about('clock'), undefined, { present: false, usedMs: 0, reason: {} })).toBeNull();
  });

  it('that returned is acknowledged by the summary that tells it (D -> A automatic); standing trouble is not', () => {
    const returned = looks('unreadable', [true, false]).state;
    const change = troubleToldInSummary(about('unreadable'), returned);
    expect(change?.journal).toMatchObject([{ event: 'acknowledged', reason: { automatic: true } }]);
    expect(standing(change?.state ?? returned)).toBe('normal');
    expect(troubleToldInSummary(about('unreadable'), looks('unreadable', [true]).state)).toBeNull();
    expect(troubleToldInSummary(about('unreadable'), normalState)).toBeNull();
    const shelved = alarmStep(
      returned,
      { kind: 'shelve', comment: null, reason: {} },
      troubleRule('unreadable'),
    );
    expect(troubleToldInSummary(about('unreadable'), shelved.state)).toBeNull();
  });

  it('has one key for a logger, another for a point, another for the site', () => {
    const point = { ...about('overdue'), machineId: 'blower-1', pointId: 'de-h', source: null };
    const keys = [about('overdue'), point, { ...point, machineId: null, pointId: null }].map(subjectKey);
    expect(new Set(keys).size).toBe(3);
  });
});

describe('a dead sensor', () => {
  const dead: readonly QualityFlag[] = ['flat', 'saturated', 'bias-out-of-range', 'hum-only', 'low-signal'];

  it('shows itself by a flat line, saturation, bias, hum or a low signal, and by no other flag', () => {
    expect(qualityFlags.filter((flag) => looksDead([flag], 'running', true)?.present === true)).toEqual(
      qualityFlags.filter((flag) => dead.includes(flag)),
    );
  });

  it('on a standing machine shows itself by saturation and bias alone, and nothing proves it alive', () => {
    const found = qualityFlags.filter((flag) => looksDead([flag], 'stopped', true)?.present === true);
    expect(found).toEqual(['saturated', 'bias-out-of-range']);
    expect(looksDead([], 'stopped', true)).toBeNull();
    expect(looksDead(['flat'], 'stopped', true)).toBeNull();
  });

  it('is not alive again by a recording that was not analysed', () => {
    expect(looksDead(['too-short'], 'running', false)).toBeNull();
    expect(looksDead(['flat'], 'running', false)?.present).toBe(true);
  });
});

describe('a low signal', () => {
  it('is under a fifth of the median of at least five good recordings', () => {
    const usual = [1.2, 0.9, 1, 50, 0.8];
    expect(lowSignal(0.199, usual)?.flag).toBe('low-signal');
    expect(lowSignal(0.2, usual)).toBeNull();
    expect(lowSignal(0.01, usual.slice(0, 4))).toBeNull();
    expect(lowSignal(0.29, [1, 1, 1, 2, 2, 2])?.detail).toContain('19 %');
  });

  it('takes no notice of values that are none', () => {
    expect(lowSignal(0.1, [Number.NaN, 0, 1, 1, 1, 1])).toBeNull();
    expect(lowSignal(Number.NaN, [1, 1, 1, 1, 1])).toBeNull();
  });
});
