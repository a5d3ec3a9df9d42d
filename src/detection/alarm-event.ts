import type { Delay, Severity } from '../config/site.ts';
import type { AlarmState, Condition, JournalEvent, JournalEventName, Telling } from './alarm.ts';

/**
 * What can happen to an alarm, and what a step answers. The machine that takes these is in alarm-state.ts.
 */

/** A recording was held against the limit (or a look was taken at a trouble). */
export interface Judged {
  readonly kind: 'judged';
  readonly severity: Condition;
  /** Used time of the recording; for trouble without recordings, the time of the look. */
  readonly usedMs: number;
  /** SI r.m.s.; null for trouble. */
  readonly level: number | null;
  /** The recording carries a data-quality flag: it may raise or hold, never clear. */
  readonly flagged: boolean;
  /** The recording proves its danger by itself: no on-delay. */
  readonly atOnce: boolean;
  /** Level, limit, flags, as data for the journal. */
  readonly reason: Readonly<Record<string, unknown>>;
}

export const alarmCommands = [
  'acknowledge',
  'reset',
  'say-again',
  'shelve',
  'unshelve',
  'shelf-expired',
  'out-of-service',
  'in-service',
  'suppress',
  'unsuppress',
  'limit-removed',
] as const;

export type AlarmCommandName = (typeof alarmCommands)[number];

/** Somebody, or the service itself, did something to the alarm. */
export interface AlarmCommand {
  readonly kind: AlarmCommandName;
  readonly comment: string | null;
  readonly reason: Readonly<Record<string, unknown>>;
}

export type AlarmEvent = Judged | AlarmCommand;

/** What of a limit, or of a kind of trouble, governs its alarm. A `Limit` of the site file is one. */
export interface AlarmRule {
  readonly side: 'upper' | 'lower';
  readonly onDelay: Delay;
  readonly offDelay: Delay;
  readonly latching: boolean;
  readonly sayAgainPercent: number | null;
}

/** `state` is the same object when nothing is to be stored; `ignored` then says why, in words for people, or is null. */
export interface AlarmStep {
  readonly state: AlarmState;
  readonly journal: readonly JournalEvent[];
  readonly tell: Telling | null;
  readonly ignored: string | null;
}

const ranks: Readonly<Record<Condition, number>> = { normal: 0, trouble: 1, alert: 2, danger: 3 };

export function rank(condition: Condition | null): number {
  return condition === null ? 0 : ranks[condition];
}

export function higher(a: Severity | null, b: Severity): Severity {
  return a !== null && rank(a) > rank(b) ? a : b;
}

export function unchanged(state: AlarmState, ignored: string | null): AlarmStep {
  return { state, journal: [], tell: null, ignored };
}

/** One more version of `before`, with its journal entries. */
export function changed(
  before: AlarmState,
  fields: Partial<AlarmState>,
  journal: readonly JournalEvent[],
  tell: Telling | null = null,
): AlarmStep {
  return { state: { ...before, ...fields, version: before.version + 1 }, journal, tell, ignored: null };
}

export function entry(
  event: JournalEventName,
  before: Condition,
  after: Condition,
  why: { usedMs: number | null; comment?: string | null; reason: Readonly<Record<string, unknown>> },
): JournalEvent {
  return { event, before, after, usedMs: why.usedMs, comment: why.comment ?? null, reason: why.reason };
}

/** The fields of a life that ends; suppressions, a rise being counted and the time of the last recording stay. */
export const lifeOver = {
  condition: 'normal',
  acknowledged: false,
  latched: false,
  highest: null,
  told: null,
  heldBack: false,
  toldLevel: null,
  knownLevel: null,
  sinceMs: null,
  count: 0,
} as const satisfies Partial<AlarmState>;
