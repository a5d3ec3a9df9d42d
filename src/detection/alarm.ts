import type { Severity } from '../config/site.ts';

/**
 * The alarm record and the words around it; the state machine itself is in alarm-state.ts. One record a limit and
 * one a kind of trouble at a scope (point, source, site). Plain data, kept in the ledger as it is.
 */
export type Condition = 'normal' | Severity;

export type Suppression = 'shelved' | 'by-design' | 'out-of-service';

export interface AlarmState {
  readonly condition: Condition;
  /** A change under way but not yet confirmed (on-delay, off-delay). */
  readonly pending: Pending | null;
  readonly acknowledged: boolean;
  /** The limit latches and its value has returned: held until reset. */
  readonly latched: boolean;
  readonly suppressions: readonly Suppression[];
  /** Highest severity in this life of the alarm. Null exactly when there is no life: nothing stands, nothing is owed. */
  readonly highest: Severity | null;
  /** Highest severity that people were told of in this life; null when it came under a suppression. */
  readonly told: Severity | null;
  /** A telling was held back by a suppression, and is made up for when the last one goes. */
  readonly heldBack: boolean;
  /** Level (SI) when last told (or held back, or fallen to), from which worsening is reckoned. */
  readonly toldLevel: number | null;
  /**
   * Level (SI) of the newest recording over the limit until it was acknowledged: who acknowledged could know it.
   * Worsening is reckoned from this where it is the worse.
   */
  readonly knownLevel: number | null;
  /** Used time of the first recording over the limit since the alarm last arose; null where there is no life. */
  readonly sinceMs: number | null;
  /** Recordings over the limit since then. */
  readonly count: number;
  /** Used time of the newest recording that moved or confirmed this state. */
  readonly usedMs: number | null;
  /** Grows by one with every stored change. */
  readonly version: number;
}

/** Where a delay has got to: recordings in a row and the used time of the first. */
export interface PendingStep {
  readonly to: Condition;
  readonly sinceMs: number;
  readonly recordings: number;
}

/** The farthest step that is being counted; `beside` is the nearer one where two are (alert beside danger). */
export interface Pending extends PendingStep {
  readonly beside: PendingStep | null;
}

export const normalState: AlarmState = {
  condition: 'normal',
  pending: null,
  acknowledged: false,
  latched: false,
  suppressions: [],
  highest: null,
  told: null,
  heldBack: false,
  toldLevel: null,
  knownLevel: null,
  sinceMs: null,
  count: 0,
  usedMs: null,
  version: 0,
};

/** The states of ANSI/ISA-18.2-2016 (IEC 62682), derived, never stored. */
export type AlarmStanding =
  | 'normal'
  | 'unacknowledged'
  | 'acknowledged'
  | 'returned-unacknowledged'
  | 'latched-unacknowledged'
  | 'latched-acknowledged'
  | 'shelved'
  | 'suppressed'
  | 'out-of-service';

export const journalEvents = [
  'raised',
  'rose',
  'fell',
  'returned',
  'acknowledged',
  'reset',
  'said-again',
  'still-stands',
  'reminded',
  'danger-unconfirmed',
  'exceeded-came-late',
  'limit-removed',
  'shelved',
  'unshelved',
  'shelf-expired',
  'out-of-service',
  'in-service',
  'suppressed',
  'unsuppressed',
  'flood-begun',
  'flood-ended',
  'note',
  'baseline-begun-again',
  'baseline-frozen',
  'baseline-confirmed',
  'started',
  'stopped',
] as const;

export type JournalEventName = (typeof journalEvents)[number];

/** What happened to one alarm; the ledger adds sequence, wall time, recording, config version, actor. */
export interface JournalEvent {
  readonly event: JournalEventName;
  readonly before: Condition;
  readonly after: Condition;
  readonly usedMs: number | null;
  readonly comment: string | null;
  /** Level, limit, delay, flags: why, as data. */
  readonly reason: Readonly<Record<string, unknown>>;
}

/** Kinds of trouble: something gives no usable data. */
export type TroubleKind =
  | 'overdue'
  | 'dead-sensor'
  | 'reads-stopped'
  | 'unreadable'
  | 'unassigned'
  | 'wrong-rate'
  | 'uneven-time'
  | 'repeats-itself'
  | 'clock'
  | 'late-sidecar'
  | 'drop-folder'
  | 'ledger'
  | 'mail-refused'
  | 'site-file';

/** What an alarm is about. `limit` belongs to a point; a trouble to a point, a source (logger) or the site. */
export type AlarmSubject =
  | {
      readonly kind: 'limit';
      readonly machineId: string;
      readonly pointId: string;
      readonly bandId: string;
      readonly limitId: string;
    }
  | {
      readonly kind: 'trouble';
      readonly trouble: TroubleKind;
      readonly machineId: string | null;
      readonly pointId: string | null;
      readonly source: string | null;
    };

/** One line that names the subject, unique within a site, independent of surrogate ids. */
export function subjectKey(subject: AlarmSubject): string {
  if (subject.kind === 'limit') {
    return `limit:${subject.machineId}/${subject.pointId}/${subject.bandId}/${subject.limitId}`;
  }
  const scope =
    subject.machineId === null ? (subject.source ?? 'site') : `${subject.machineId}/${subject.pointId ?? ''}`;
  return `trouble:${subject.trouble}:${scope}`;
}

/** What a step of detection wants stored and told. */
export interface AlarmChange {
  readonly subject: AlarmSubject;
  readonly state: AlarmState;
  readonly journal: readonly JournalEvent[];
  /** Set when people are to be told; the severity of the telling. */
  readonly tell: Telling | null;
}

export interface Telling {
  readonly severity: Severity;
  readonly event: JournalEventName;
  /** Level (SI) that caused it, where there is one. */
  readonly level: number | null;
}
