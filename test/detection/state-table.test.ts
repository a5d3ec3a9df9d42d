import { readFileSync, writeFileSync } from 'node:fs';
import { expect, it } from 'vitest';
import { type AlarmStanding, type AlarmState, normalState } from '../../src/detection/alarm.ts';
import {
  type AlarmCommandName,
  type AlarmEvent,
  type AlarmRule,
  alarmCommands,
  type Judged,
} from '../../src/detection/alarm-event.ts';
import { alarmStep, heldStanding, standing } from '../../src/detection/alarm-state.ts';

/**
 * The state table in DEVELOPERS.md is made from the code. UPDATE_EXPECTED=1 writes it anew: read the diff, and commit
 * only what you can explain.
 */
const at = (severity: Judged['severity'], more: Partial<Judged> = {}): Judged => ({
  kind: 'judged',
  severity,
  usedMs: 9,
  level: { normal: 1, trouble: 0, alert: 3, danger: 5 }[severity],
  flagged: false,
  atOnce: false,
  reason: {},
  ...more,
});
const command = (kind: AlarmCommandName): AlarmEvent => ({ kind, comment: null, reason: {} });

const ruleWith = (latching: boolean): AlarmRule => ({
  side: 'upper',
  onDelay: { recordings: 1 },
  offDelay: { recordings: 1 },
  latching,
  sayAgainPercent: 25,
});

const letters: Readonly<Record<AlarmStanding, string>> = {
  normal: 'A',
  unacknowledged: 'B',
  acknowledged: 'C',
  'returned-unacknowledged': 'D',
  'latched-unacknowledged': 'E',
  'latched-acknowledged': 'F',
  shelved: 'G',
  suppressed: 'H',
  'out-of-service': 'I',
};

interface Column {
  readonly title: string;
  readonly way: readonly AlarmEvent[];
  readonly latching?: boolean;
}

const columns: readonly Column[] = [
  { title: 'A', way: [] },
  { title: 'B alert', way: [at('alert')] },
  { title: 'B danger', way: [at('danger')] },
  { title: 'C alert', way: [at('alert'), command('acknowledge')] },
  { title: 'C danger', way: [at('danger'), command('acknowledge')] },
  { title: 'D', way: [at('alert'), at('normal')] },
  { title: 'E', way: [at('alert'), at('normal')], latching: true },
  { title: 'F', way: [at('alert'), command('acknowledge'), at('normal')], latching: true },
];

const recordings: Readonly<Record<string, AlarmEvent>> = {
  'level normal': at('normal'),
  'level normal, flagged': at('normal', { flagged: true }),
  'level over alert': at('alert'),
  'level over alert, 25 % up': at('alert', { level: 4 }),
  'level over danger': at('danger'),
};

function reached({ way, latching = false }: Column): AlarmState {
  return way.reduce((state, event) => alarmStep(state, event, ruleWith(latching)).state, normalState);
}

/** 'B alert!': the next state, its severity where one stands, '!' where people are told; '·' where nothing changes. */
function cell(before: AlarmState, event: AlarmEvent, latching = false): string {
  const { state, journal, tell } = alarmStep(before, event, ruleWith(latching));
  if (state === before && journal.length === 0) return '·';
  const held = state.suppressions.length > 0 ? `${letters[standing(state)]} over ` : '';
  const severity = state.condition === 'normal' ? '' : ` ${state.condition}`;
  return `${held}${letters[heldStanding(state)]}${severity}${tell === null ? '' : '!'}`;
}

function markdown(heads: readonly string[], rows: readonly (readonly string[])[]): string {
  const line = (cells: readonly string[]) => `| ${cells.join(' | ')} |`;
  return [line(heads), line(heads.map(() => '---')), ...rows.map(line)].join('\n');
}

function mainTable(): string {
  const latches = [['level normal, the limit latches', at('normal'), true] as const];
  const rows = [
    ...Object.entries(recordings).map(([name, event]) => [name, event, false] as const),
    ...latches,
    ...alarmCommands.map((name) => [`\`${name}\``, command(name), false] as const),
  ];
  return markdown(
    ['', ...columns.map(({ title }) => title)],
    rows.map(([name, event, latching]) => [
      name,
      ...columns.map((column) => cell(reached(column), event, latching || column.latching === true)),
    ]),
  );
}

/** What comes of each state when a suppression ends, without and with a rise while it lay over it. */
function endsTable(): string {
  const pairs = [
    ['shelve', 'unshelve'],
    ['shelve', 'shelf-expired'],
    ['out-of-service', 'in-service'],
    ['suppress', 'unsuppress'],
  ] as const;
  const whiles: readonly (readonly [string, readonly AlarmEvent[]])[] = [
    ['nothing happened', []],
    ['it rose to danger', [at('danger')]],
    ['it came and went', [at('danger'), at('normal')]],
  ];
  const rows = pairs.flatMap(([on, off]) =>
    whiles.map(([name, events]) => [
      `\`${off}\`, ${name}`,
      ...columns.map((column) => {
        const held = { ...column, way: [...column.way, command(on), ...events] };
        return cell(reached(held), command(off), column.latching);
      }),
    ]),
  );
  return markdown(['', ...columns.map(({ title }) => `over ${title}`)], rows);
}

it('the state table in DEVELOPERS.md is that of the code', () => {
  const file = new URL('../../DEVELOPERS.md', import.meta.url);
  const [begin, end] = ['<!-- state table, written by its test -->', '<!-- end of the state table -->'];
  const made = `${begin}\n\n${mainTable()}\n\n${endsTable()}\n\n${end}`;
  const text = readFileSync(file, 'utf8');
  const [from, to] = [text.indexOf(begin), text.indexOf(end)];
  expect(from).toBeGreaterThan(0);
  expect(to).toBeGreaterThan(from);
  if (process.env.UPDATE_EXPECTED === '1')
    writeFileSync(file, text.slice(0, from) + made + text.slice(to + end.length));
  expect(readFileSync(file, 'utf8')).toContain(made);
});
