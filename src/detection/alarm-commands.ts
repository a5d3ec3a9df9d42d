import type { AlarmState, JournalEventName, Suppression, Telling } from './alarm.ts';
import { normalState } from './alarm.ts';
import {
  type AlarmCommand,
  type AlarmStep,
  changed,
  entry,
  higher,
  lifeOver,
  unchanged,
} from './alarm-event.ts';

/**
 * What people, and the service itself, do to an alarm. The states and invariants are those of alarm-state.ts; which
 * of these is called in which state stands in its table.
 */
export type Act = (state: AlarmState, command: AlarmCommand) => AlarmStep;

/** An answer for people where the command has no meaning in this state. */
export const nothing =
  (why: string): Act =>
  (state) =>
    unchanged(state, why);

/** B -> C, E -> F. */
export const acknowledge: Act = (state, command) =>
  changed(state, { acknowledged: true }, [journalled('acknowledged', state, command)]);

/** D -> A. */
export const acknowledgeAndEnd: Act = (state, command) =>
  changed(state, lifeOver, [journalled('acknowledged', state, command)]);

/** C -> B by time: who acknowledged it has had his time, and it still stands. Under a suppression nothing is told. */
export const sayAgainInTime: Act = (state, command) => {
  const { condition, suppressions } = state;
  if (suppressions.length > 0 || condition === 'normal') return unchanged(state, 'it is under a suppression');
  const tell: Telling = {
    severity: condition,
    event: 'still-stands',
    level: state.knownLevel ?? state.toldLevel,
  };
  const fields = { acknowledged: false, told: higher(state.told, condition) };
  return changed(state, fields, [journalled('still-stands', state, command)], tell);
};

/** E -> D; -> A where nobody was told, so that nobody owes an acknowledgement. */
export const release: Act = (state, command) => {
  const fields = state.told === null ? lifeOver : { latched: false, heldBack: false };
  return changed(state, fields, [journalled('reset', state, command)]);
};

/** F -> A. */
export const releaseAndEnd: Act = (state, command) =>
  changed(state, lifeOver, [journalled('reset', state, command)]);

/** Any -> G, H or I. Once more while it stands is journalled too: the time or the reason is another. */
export function suppressAs(suppression: Suppression, event: JournalEventName): Act {
  return (state, command) => {
    const others = state.suppressions.filter((one) => one !== suppression);
    return changed(state, { suppressions: [...others, suppression] }, [journalled(event, state, command)]);
  };
}

/**
 * G, H or I -> what the condition is now. A person's suppression (shelved, out of service) was a promise to look
 * again: an alarm that stands is told anew and needs a new acknowledgement, and so is a latched one that nobody has
 * acknowledged. After suppression by design only what was held back is told.
 */
export function lift(suppression: Suppression, event: JournalEventName): Act {
  return (state, command) => {
    if (!state.suppressions.includes(suppression)) return unchanged(state, `it is not ${words[suppression]}`);
    const suppressions = state.suppressions.filter((one) => one !== suppression);
    const calls = state.condition !== 'normal' || (state.latched && !state.acknowledged);
    const anew = suppression !== 'by-design' && calls;
    const owed = state.heldBack || anew;
    const severity = state.condition === 'normal' ? state.highest : state.condition;
    const journal = [journalled(event, state, command)];
    if (!owed || severity === null) return changed(state, { suppressions }, journal);
    if (suppressions.length > 0) return changed(state, { suppressions, heldBack: true }, journal);
    const told = higher(state.told, severity);
    const tell: Telling = { severity, event, level: state.toldLevel };
    return changed(state, { suppressions, heldBack: false, acknowledged: false, told }, journal, tell);
  };
}

/** The limit has left the site file. An unacknowledged danger is told at once, all else in the next summary. */
export const removeLimit: Act = (state, command) => {
  const { version, usedMs, highest } = state;
  const stood = highest !== null || state.suppressions.length > 0;
  if (!stood && state.pending === null) return unchanged(state, 'nothing stood');
  const danger = highest === 'danger' && !state.acknowledged && state.suppressions.length === 0;
  const tell: Telling | null = danger
    ? { severity: 'danger', event: 'limit-removed', level: state.toldLevel }
    : null;
  const journal = stood ? [entry('limit-removed', state.condition, 'normal', { ...command, usedMs })] : [];
  return changed({ ...normalState, version, usedMs }, {}, journal, tell);
};

const words: Readonly<Record<Suppression, string>> = {
  shelved: 'shelved',
  'by-design': 'suppressed',
  'out-of-service': 'out of service',
};

function journalled(event: JournalEventName, state: AlarmState, command: AlarmCommand) {
  return entry(event, state.condition, state.condition, { ...command, usedMs: state.usedMs });
}
