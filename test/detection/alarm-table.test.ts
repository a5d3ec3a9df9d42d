import { readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { type AlarmState, normalState } from '../../src/detection/alarm.ts';
import {
  type AlarmCommandName,
  type AlarmEvent,
  type AlarmRule,
  type AlarmStep,
  alarmCommands,
  type Judged,
} from '../../src/detection/alarm-event.ts';
import { alarmStep, standing } from '../../src/detection/alarm-state.ts';
import { brokenInvariants } from './alarm-invariants.ts';

/**
 * Grouped as: every reachable state under every event; the table as people can read it; the standard's transitions
 * one by one (ANSI/ISA-18.2-2016 and IEC 62682, cited from memory, by state letters).
 *
 * UPDATE_EXPECTED=1 rewrites alarm-table.txt. Read the diff, and commit only what you can explain.
 */
const at = (usedMs: number, severity: Judged['severity'], more: Partial<Judged> = {}): Judged => ({
  kind: 'judged',
  severity,
  usedMs,
  level: { normal: 1, trouble: 0, alert: 3, danger: 5 }[severity],
  flagged: false,
  atOnce: false,
  reason: {},
  ...more,
});
const command = (kind: AlarmCommandName): AlarmEvent => ({ kind, comment: null, reason: {} });
const plainRule: AlarmRule = {
  side: 'upper',
  onDelay: { recordings: 1 },
  offDelay: { recordings: 1 },
  latching: false,
  sayAgainPercent: 25,
};

describe('every reachable state under every event', () => {
  const judgements = (usedMs: number): Judged[] =>
    (['normal', 'alert', 'danger'] as const).flatMap((severity) => [
      at(usedMs, severity),
      at(usedMs, severity, { flagged: true }),
      at(usedMs, severity, { atOnce: severity === 'danger', level: 9 }),
    ]);

  /** Counts and times without end are folded, so that the walk ends. */
  const folded = (s: AlarmState): string =>
    JSON.stringify(
      { ...s, version: 0, usedMs: 0, sinceMs: s.sinceMs !== null, count: s.count > 0 },
      (k, v) => (k === 'sinceMs' && typeof v === 'number' ? 0 : k === 'recordings' ? Math.min(v, 3) : v),
    );

  it.each([
    { latching: false, recordings: 1 },
    { latching: true, recordings: 1 },
    { latching: false, recordings: 2 },
    { latching: true, recordings: 3 },
  ])(
    'is defined and keeps all invariants (latching $latching, delays $recordings)',
    ({ latching, recordings }) => {
      const rule = { ...plainRule, latching, onDelay: { recordings }, offDelay: { recordings } };
      const seen = new Map([[folded(normalState), normalState]]);
      const waiting = [normalState];
      let steps = 0;
      for (let state = waiting.pop(); state !== undefined; state = waiting.pop()) {
        const events = [...judgements((state.usedMs ?? 0) + 1), ...alarmCommands.map(command)];
        for (const event of events) {
          const step = alarmStep(state, event, rule);
          steps++;
          const broken = brokenInvariants(state, event, step);
          if (broken.length > 0) expect({ broken, state, event, step }).toBeNull();
          const key = folded(step.state);
          if (seen.has(key)) continue;
          seen.set(key, step.state);
          waiting.push(step.state);
        }
      }
      const standings = new Set([...seen.values()].map(standing));
      expect(standings.size).toBe(latching ? 9 : 7);
      expect(seen.size).toBeGreaterThan(100);
      expect(steps).toBe(seen.size * 20);
    },
  );
});

/** States as people would bring them about, by name. */
function reached(events: readonly AlarmEvent[], rule: AlarmRule): AlarmState {
  return events.reduce((state, event) => alarmStep(state, event, rule).state, normalState);
}

const ways: Readonly<Record<string, readonly AlarmEvent[]>> = {
  'A normal': [],
  'B alert unacknowledged': [at(1, 'alert')],
  'B danger unacknowledged': [at(1, 'danger')],
  'C alert acknowledged': [at(1, 'alert'), command('acknowledge')],
  'C danger acknowledged': [at(1, 'danger'), command('acknowledge')],
  'D returned unacknowledged': [at(1, 'alert'), at(2, 'normal')],
  'E latched unacknowledged': [at(1, 'danger'), at(2, 'normal')],
  'F latched acknowledged': [at(1, 'danger'), command('acknowledge'), at(2, 'normal')],
};
const over: Readonly<Record<string, readonly AlarmEvent[]>> = {
  '': [],
  ', shelved': [command('shelve')],
  ', suppressed by design': [command('suppress')],
  ', out of service': [command('out-of-service')],
};
const listed: Readonly<Record<string, AlarmEvent>> = {
  normal: at(9, 'normal'),
  'normal, flagged': at(9, 'normal', { flagged: true }),
  alert: at(9, 'alert'),
  'alert, 25 % up': at(9, 'alert', { level: 4 }),
  danger: at(9, 'danger'),
  'danger, flagged': at(9, 'danger', { flagged: true }),
  ...Object.fromEntries(alarmCommands.map((name) => [name, command(name)])),
};

function line(name: string, before: AlarmState, step: AlarmStep): string {
  const { state, journal, tell, ignored } = step;
  const to = state === before ? 'stays' : `${standing(state)}, ${state.condition}`;
  const owes = state.heldBack ? ' (telling held back)' : '';
  const told = tell === null ? '' : `; TELL ${tell.severity}`;
  const events = journal.length > 0 ? `; journal ${journal.map(({ event }) => event).join(', ')}` : '';
  return `  ${name.padEnd(16)} -> ${to}${owes}${events}${told}${ignored === null ? '' : `; ${ignored}`}`;
}

it('the table of states and events is the one on file', () => {
  const lines: string[] = [];
  for (const [where, events] of Object.entries(ways)) {
    for (const [addition, suppression] of Object.entries(over)) {
      const rule = { ...plainRule, latching: /^[EF]/.test(where) };
      const state = reached([...events, ...suppression], rule);
      lines.push(`${where}${addition}`);
      for (const [name, event] of Object.entries(listed)) {
        lines.push(line(name, state, alarmStep(state, event, rule)));
      }
      lines.push('');
    }
  }
  const file = join(import.meta.dirname, 'alarm-table.txt');
  const text = lines.join('\n');
  if (process.env.UPDATE_EXPECTED === '1') writeFileSync(file, text);
  expect(text).toBe(readFileSync(file, 'utf8'));
});

describe('transitions of ANSI/ISA-18.2-2016 and IEC 62682', () => {
  const latching = { ...plainRule, latching: true };
  const after = (way: string, event: AlarmEvent, rule = plainRule) =>
    standing(alarmStep(reached(ways[way] as AlarmEvent[], rule), event, rule).state);

  it.each([
    ['A -> B, the condition arises', 'A normal', at(9, 'alert'), 'unacknowledged', plainRule],
    ['B -> C, acknowledge', 'B alert unacknowledged', command('acknowledge'), 'acknowledged', plainRule],
    ['C -> A, the condition clears', 'C alert acknowledged', at(9, 'normal'), 'normal', plainRule],
    [
      'B -> D, the condition clears first',
      'B alert unacknowledged',
      at(9, 'normal'),
      'returned-unacknowledged',
      plainRule,
    ],
    ['D -> A, acknowledge', 'D returned unacknowledged', command('acknowledge'), 'normal', plainRule],
    ['D -> B, arises again', 'D returned unacknowledged', at(9, 'alert'), 'unacknowledged', plainRule],
    [
      'C -> B, re-alarm by worsening',
      'C alert acknowledged',
      at(9, 'alert', { level: 4 }),
      'unacknowledged',
      plainRule,
    ],
    ['C -> B, severity rises', 'C alert acknowledged', at(9, 'danger'), 'unacknowledged', plainRule],
    [
      'B -> E, a latching alarm clears',
      'B danger unacknowledged',
      at(9, 'normal'),
      'latched-unacknowledged',
      latching,
    ],
    [
      'C -> F, a latching alarm clears',
      'C danger acknowledged',
      at(9, 'normal'),
      'latched-acknowledged',
      latching,
    ],
    [
      'E -> F, acknowledge',
      'E latched unacknowledged',
      command('acknowledge'),
      'latched-acknowledged',
      latching,
    ],
    ['C -> B, re-alarm by time', 'C alert acknowledged', command('say-again'), 'unacknowledged', plainRule],
    ['F -> A, reset', 'F latched acknowledged', command('reset'), 'normal', latching],
    ['E -> D, reset', 'E latched unacknowledged', command('reset'), 'returned-unacknowledged', latching],
    ['any -> G, shelve', 'B alert unacknowledged', command('shelve'), 'shelved', plainRule],
    ['any -> H, suppressed by design', 'A normal', command('suppress'), 'suppressed', plainRule],
    [
      'any -> I, out of service',
      'C danger acknowledged',
      command('out-of-service'),
      'out-of-service',
      plainRule,
    ],
  ] as const)('%s', (_title, way, event, expected, rule) => {
    expect(after(way, event, rule)).toBe(expected);
  });

  it.each([
    ['shelve', 'unshelve'],
    ['shelve', 'shelf-expired'],
    ['out-of-service', 'in-service'],
    ['suppress', 'unsuppress'],
  ] as const)('G, H, I -> A or B after %s and %s, by the condition now, which was tracked on', (on, off) => {
    const back = (severity: Judged['severity']) => {
      const under = reached([command(on), at(1, 'alert'), at(2, severity)], plainRule);
      return alarmStep(under, command(off), plainRule);
    };
    expect(standing(back('normal').state)).toBe('normal');
    expect(back('normal').tell).toBeNull();
    expect(standing(back('danger').state)).toBe('unacknowledged');
    expect(back('danger').tell).toMatchObject({ severity: 'danger', level: 5 });
  });
});
