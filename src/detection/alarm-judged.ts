import type { AlarmState, JournalEvent, JournalEventName, Telling } from './alarm.ts';
import {
  type AlarmRule,
  type AlarmStep,
  changed,
  entry,
  higher,
  type Judged,
  lifeOver,
  rank,
  unchanged,
} from './alarm-event.ts';
import { type Counted, countRecording } from './persistence.ts';

/**
 * What a judged recording does to an alarm: raise, raise further, lower, return to normal, hold, say again. The
 * states and invariants are those of alarm-state.ts.
 */
export function judge(state: AlarmState, judged: Judged, rule: AlarmRule): AlarmStep {
  const counted = countRecording(state, judged, rule);
  const unconfirmed = dangerUnconfirmed(state, counted, judged);
  if (rank(counted.condition) > rank(state.condition)) return rise(state, counted, judged, unconfirmed);
  if (counted.condition === 'normal' && state.condition !== 'normal') return comeBack(state, judged, rule);
  if (counted.condition !== state.condition) return fall(state, counted, judged);
  return hold(state, counted, judged, rule, unconfirmed);
}

/** A danger that the on-delay holds back is journalled when its run begins, so that page and summary show it. */
function dangerUnconfirmed(state: AlarmState, counted: Counted, judged: Judged): readonly JournalEvent[] {
  const begins = counted.pending?.to === 'danger' && state.pending?.to !== 'danger';
  return begins ? [entry('danger-unconfirmed', counted.condition, counted.condition, judged)] : [];
}

/** A -> B, D -> B, E -> B, F -> B, or a rise in severity within B or C (-> B). */
function rise(
  state: AlarmState,
  counted: Counted,
  judged: Judged,
  unconfirmed: readonly JournalEvent[],
): AlarmStep {
  const to = counted.condition;
  if (to === 'normal') throw new Error('an alarm cannot rise to normal');
  const arises = state.condition === 'normal';
  const event: JournalEventName = arises ? 'raised' : 'rose';
  const call = announce(state, { severity: to, event, level: judged.level });
  return changed(
    state,
    {
      condition: to,
      pending: counted.pending,
      acknowledged: false,
      latched: false,
      highest: higher(state.highest, to),
      // What comes again before anybody acknowledged it stands since then, not since it came first.
      sinceMs: (arises ? null : state.sinceMs) ?? counted.begun?.sinceMs ?? judged.usedMs,
      // Recordings of the on-delay belong to it; in a standing alarm they were counted as they came.
      count: arises ? (counted.begun?.recordings ?? 1) : state.count + 1,
      usedMs: newest(state, judged),
      ...call.fields,
    },
    [entry(event, state.condition, to, judged), ...unconfirmed],
    call.tell,
  );
}

/** Danger to alert: stays in B or C, nothing is sent, nothing needs to be acknowledged anew. */
function fall(state: AlarmState, counted: Counted, judged: Judged): AlarmStep {
  return changed(
    state,
    {
      condition: counted.condition,
      pending: counted.pending,
      toldLevel: judged.level,
      knownLevel: judged.level,
      count: state.count + 1,
      usedMs: newest(state, judged),
    },
    [entry('fell', state.condition, counted.condition, judged)],
  );
}

/** B -> D or E, C -> A or F. A life that came and went under a suppression leaves nothing to acknowledge. */
function comeBack(state: AlarmState, judged: Judged, rule: AlarmRule): AlarmStep {
  const over = !rule.latching && (state.acknowledged || state.told === null);
  const held = {
    condition: 'normal',
    latched: rule.latching,
    toldLevel: null,
    knownLevel: null,
    heldBack: rule.latching && state.heldBack,
  } as const;
  return changed(state, { ...(over ? lifeOver : held), pending: null, usedMs: newest(state, judged) }, [
    entry('returned', state.condition, 'normal', judged),
  ]);
}

function hold(
  state: AlarmState,
  counted: Counted,
  judged: Judged,
  rule: AlarmRule,
  unconfirmed: readonly JournalEvent[],
): AlarmStep {
  const { pending } = counted;
  const stands = state.condition !== 'normal' && rank(judged.severity) >= rank(state.condition);
  const counts = stands || (state.condition !== 'normal' && judged.severity !== 'normal');
  if (!counts && pending === state.pending) return unchanged(state, null);
  const again = stands && hasWorsened(state, judged, rule) ? sayAgain(state, judged) : null;
  return changed(
    state,
    {
      pending,
      count: state.count + (counts ? 1 : 0),
      usedMs: newest(state, judged),
      ...(counts ? levelsKnown(state, judged.level) : {}),
      ...again?.fields,
    },
    [...unconfirmed, ...(again?.journal ?? [])],
    again?.tell ?? null,
  );
}

/** C -> B by worsening. Under a suppression it waits: the level is compared again when the last one has gone. */
function hasWorsened(state: AlarmState, judged: Judged, rule: AlarmRule): boolean {
  const { toldLevel, knownLevel } = state;
  if (!state.acknowledged || state.suppressions.length > 0) return false;
  if (rule.sayAgainPercent === null || toldLevel === null || judged.level === null) return false;
  const by = rule.sayAgainPercent / 100;
  const known = knownLevel ?? toldLevel;
  return rule.side === 'upper'
    ? judged.level >= Math.max(toldLevel, known) * (1 + by)
    : judged.level <= Math.min(toldLevel, known) * (1 - by);
}

/** What will be told when the suppression goes is the newest level, and worsening is reckoned from that. */
function levelsKnown(state: AlarmState, level: number | null): Partial<AlarmState> {
  if (level === null) return {};
  if (state.heldBack || state.suppressions.some((one) => one !== 'by-design'))
    return { toldLevel: level, knownLevel: level };
  return state.acknowledged ? {} : { knownLevel: level };
}

function sayAgain(state: AlarmState, judged: Judged) {
  const { condition } = state;
  if (condition === 'normal') throw new Error('a normal alarm cannot worsen');
  const call = announce(state, { severity: condition, event: 'said-again', level: judged.level });
  return {
    fields: { acknowledged: false, ...call.fields },
    journal: [entry('said-again', condition, condition, judged)],
    tell: call.tell,
  };
}

/** People are told, or the telling is held back by a suppression; either way worsening is reckoned from here. */
function announce(
  state: AlarmState,
  telling: Telling,
): { fields: Partial<AlarmState>; tell: Telling | null } {
  if (state.suppressions.length > 0) {
    return { fields: { heldBack: true, toldLevel: telling.level, knownLevel: telling.level }, tell: null };
  }
  return {
    fields: {
      told: higher(state.told, telling.severity),
      heldBack: false,
      toldLevel: telling.level,
      knownLevel: telling.level,
    },
    tell: telling,
  };
}

function newest(state: AlarmState, judged: Judged): number {
  return state.usedMs === null ? judged.usedMs : Math.max(state.usedMs, judged.usedMs);
}
