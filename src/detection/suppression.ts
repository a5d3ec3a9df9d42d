import { type SuppressedWhile, suppressedWhileText } from '../config/suppressed-while.ts';
import {
  type AlarmChange,
  type AlarmState,
  type AlarmSubject,
  normalState,
  type Suppression,
  subjectKey,
} from './alarm.ts';
import type { AlarmCommand, AlarmCommandName, AlarmRule } from './alarm-event.ts';
import { alarmStep } from './alarm-state.ts';
import type { MachineState } from './machine-state.ts';
import { changeOf } from './trouble.ts';

/**
 * Suppressions that lie on a place or follow the plant, and not on one alarm alone (that is shelving): out of service,
 * and suppression by design. What holds is worked out anew whenever it is asked for; the alarm follows it.
 *
 * - It follows before a recording is judged, in the same step of the ledger: nothing is told that is held back by then.
 * - An alarm at rest is not written to only to say that it would be held back. It takes its suppressions when something
 *   happens to it; what stands, is latched or waits to be acknowledged takes them at once.
 * - What begins comes before what ends, so that nothing is told between two.
 */
export interface SuppressionsDue {
  /** null: in service. */
  readonly outOfService: Because | null;
  readonly byDesign: Because | null;
}

export interface Because {
  readonly comment: string | null;
  readonly reason: Readonly<Record<string, unknown>>;
}

export const nothingDue: SuppressionsDue = { outOfService: null, byDesign: null };

/** What suppression by design looks at. */
export interface PlantNow {
  /** null: not known, because nothing comes from the machine any more. */
  readonly stateOf: (machineId: string) => MachineState | null;
  /** A trouble of that point stands; null: of any point of the machine. */
  readonly hasTrouble: (machineId: string, pointId: string | null) => boolean;
}

/** Whether one of the conditions holds, as the reason for the journal. What is not known holds nothing back. */
export function heldByDesign(conditions: readonly SuppressedWhile[], plant: PlantNow): Because | null {
  const holding = conditions.find((one) =>
    one.by === 'trouble'
      ? plant.hasTrouble(one.machineId, one.pointId)
      : plant.stateOf(one.machineId) === one.state,
  );
  return holding === undefined ? null : { comment: null, reason: { while: suppressedWhileText(holding) } };
}

const kinds: readonly {
  readonly suppression: Suppression;
  readonly due: keyof SuppressionsDue;
  readonly on: AlarmCommandName;
  readonly off: AlarmCommandName;
}[] = [
  { suppression: 'out-of-service', due: 'outOfService', on: 'out-of-service', off: 'in-service' },
  { suppression: 'by-design', due: 'byDesign', on: 'suppress', off: 'unsuppress' },
];

/** Commands are the same under every rule: only recordings are judged by it. */
export const ruleOfCommands: AlarmRule = {
  side: 'upper',
  onDelay: { recordings: 1 },
  offDelay: { recordings: 1 },
  latching: false,
  sayAgainPercent: null,
};

/** The steps by which an alarm comes under what is due, and out of what is not; none where it is there already. */
export function followSuppressions(
  subject: AlarmSubject,
  before: AlarmState,
  due: SuppressionsDue,
  ended: Because = { comment: null, reason: {} },
): AlarmChange[] {
  const has = ({ suppression }: (typeof kinds)[number]) => before.suppressions.includes(suppression);
  const commands: AlarmCommand[] = [
    ...kinds.flatMap((kind) => {
      const because = due[kind.due];
      return because !== null && !has(kind) ? [{ kind: kind.on, ...because }] : [];
    }),
    ...kinds.flatMap((kind) => (due[kind.due] === null && has(kind) ? [{ kind: kind.off, ...ended }] : [])),
  ];
  const changes: AlarmChange[] = [];
  let state = before;
  for (const command of commands) {
    const change = changeOf(subject, state, alarmStep(state, command, ruleOfCommands));
    if (change === null) continue;
    changes.push(change);
    state = change.state;
  }
  return changes;
}

export interface StatesUnder {
  /** By `subjectKey`, as they are to be judged. */
  readonly states: Map<string, AlarmState>;
  /** What brought them there. */
  readonly brought: ReadonlyMap<string, readonly AlarmChange[]>;
}

/** States of subjects with the suppressions that hold now. */
export function statesUnder(
  subjects: readonly AlarmSubject[],
  earlier: ReadonlyMap<string, AlarmState>,
  dueOf: (subject: AlarmSubject, state: AlarmState) => SuppressionsDue,
): StatesUnder {
  const states = new Map(earlier);
  const brought = new Map<string, readonly AlarmChange[]>();
  for (const subject of subjects) {
    const key = subjectKey(subject);
    const before = earlier.get(key) ?? normalState;
    const changes = followSuppressions(subject, before, dueOf(subject, before));
    const last = changes.at(-1);
    if (last === undefined) continue;
    states.set(key, last.state);
    brought.set(key, changes);
  }
  return { states, brought };
}

/** Before the first change of each subject stands what brought its state there. */
export function withBrought(
  { brought }: Pick<StatesUnder, 'brought'>,
  ...lists: readonly (readonly AlarmChange[])[]
): AlarmChange[][] {
  const done = new Set<string>();
  return lists.map((changes) =>
    changes.flatMap((change) => {
      const key = subjectKey(change.subject);
      if (done.has(key)) return [change];
      done.add(key);
      return [...(brought.get(key) ?? []), change];
    }),
  );
}
