import type { Generated } from 'kysely';

/** The current record of each limit and each kind of trouble; see detection/alarm.ts. */
export interface AlarmStatesTable {
  key: string;
  /** JSON of the AlarmSubject. */
  subject: string;
  machine_id: number | null;
  point_id: number | null;
  limit_id: number | null;
  /** Number of the life that stands or last stood. */
  number: number | null;
  condition: string;
  /** JSON of the whole AlarmState. */
  state: string;
  version: number;
  /** 1: under a suppression of whatever kind. */
  suppressed: Generated<number>;
  /** When it was shelved, until when, by whom and why; null where it is not. */
  shelved_ms: number | null;
  shelved_until_ms: number | null;
  shelved_by: string | null;
  shelved_comment: string | null;
}

/** Machines (point_id null) and points taken out of service; a row goes when its time is over. */
export interface OutOfServiceTable {
  id: Generated<number>;
  machine_id: number;
  point_id: number | null;
  from_ms: number;
  until_ms: number;
  by_name: string;
  comment: string;
}

/** One life of an alarm or trouble: from raised to normal again (and acknowledged). */
export interface AlarmsTable {
  number: Generated<number>;
  key: string;
  severity: string;
  raised_used_ms: number | null;
  raised_wall_ms: number;
  /** Null while it stands or waits to be acknowledged. */
  ended_wall_ms: number | null;
  acknowledged_wall_ms: number | null;
  acknowledged_by: string | null;
}

export interface JournalTable {
  /** The order of the journal; times are not. */
  sequence: Generated<number>;
  key: string | null;
  number: number | null;
  event: string;
  before: string | null;
  after: string | null;
  used_ms: number | null;
  wall_ms: number;
  recording_id: number | null;
  config_version_id: number | null;
  actor: string;
  /** service | command | page | link */
  via: string;
  comment: string | null;
  /** JSON. */
  reason: string;
}

/** Events due to be told; committed with the event, composed when the mail leaves. */
export interface ToTellTable {
  id: Generated<number>;
  journal_sequence: number;
  key: string | null;
  number: number | null;
  machine_id: number | null;
  severity: string;
  event: string;
  /** Level (SI) that caused it, where there is one. */
  level: number | null;
  /** Names the event for ever; the Message-ID is made from it. */
  identity: string;
  wall_ms: number;
  message_id: number | null;
  /** A reminder that was overtaken by an acknowledgement before its mail was made; null: it was not. */
  withdrawn_ms: Generated<number | null>;
  /** 1: belongs to a backlog and is told in one catch-up mail if it is over by then. */
  from_backlog: number;
}

/** Times in which more alarms came than a person can take in one by one; at most one stands. */
export interface FloodsTable {
  id: Generated<number>;
  from_ms: number;
  begun_ms: number;
  ended_ms: number | null;
}

/** One conversation a machine, from its first alarm until all are normal. machine_id null: the site's own. */
export interface ThreadsTable {
  id: Generated<number>;
  machine_id: number | null;
  opened_ms: number;
  closed_ms: number | null;
  subject: string;
  severity: string;
}

export interface MessagesTable {
  id: Generated<number>;
  /** alarm | catch-up | summary | service | test */
  kind: string;
  /** Names the message for ever (its events, or its local date); unique. */
  identity: string;
  priority: number;
  group_key: string;
  thread_id: number | null;
  subject: string;
  created_ms: number;
  not_before_ms: number;
  superseded_by: number | null;
}

export interface DeliveriesTable {
  message_id: number;
  recipient: string;
  /** Message-ID of the mail to this recipient. */
  mail_id: string;
  bytes: Uint8Array;
  due_ms: number;
  tries: number;
  last_try_ms: number | null;
  last_answer: string | null;
  /** waiting | accepted | failed | superseded */
  state: string;
}
