import type { Severity } from '../config/site.ts';
import type { TroubleKind } from '../detection/alarm.ts';
import type { BandFacts, MachineFacts, PointFacts, SiteFacts } from './facts.ts';

/** What the rarer mails are made from: catch-up, word from the service itself, test; conventions as in facts.ts. */

/** Alarms that came and went while nothing could be evaluated or sent. */
export interface CatchUpFacts {
  readonly site: SiteFacts;
  readonly writtenMs: number;
  /** backlog: recordings came together after a pause; mail-waited: no mail left for long, or none was to. */
  readonly reason: 'backlog' | 'mail-waited';
  readonly fromMs: number;
  readonly toMs: number;
  /** Recordings evaluated in that time. */
  readonly recordings: number;
  readonly passed: readonly PassedAlarm[];
}

export interface PassedAlarm {
  readonly number: number;
  readonly severity: Severity;
  readonly machine: MachineFacts | null;
  readonly point: PointFacts | null;
  /** Null for a trouble. */
  readonly band: BandFacts | null;
  /** Highest level in that life, SI r.m.s. */
  readonly highest: number | null;
  /** What it was, for a trouble. */
  readonly trouble: TroubleKind | null;
  readonly beganMs: number;
  /** Null: it still stands and has been mailed by itself. */
  readonly endedMs: number | null;
}

/** Word from the service itself. */
export type ServiceFacts = ServiceStartFacts | MessageFailedFacts;

export interface ServiceStartFacts {
  /** older-ledger: what is beside the ledger knows more than it does, because a backup was put in its place. */
  readonly kind: 'first-start' | 'start-after-unclean-stop' | 'start-with-older-ledger';
  readonly site: SiteFacts;
  readonly writtenMs: number;
  readonly machines: number;
  readonly points: number;
  readonly limits: number;
  /** `machine/point` of those that can never alarm. */
  readonly pointsWithoutLimit: readonly string[];
  readonly recipients: number;
  /** 'HH:MM' in the site's zone; null: no summary is sent. */
  readonly summaryAt: string | null;
  readonly dropFolder: string;
  /** Last sign of life before an unclean stop. */
  readonly lastSeenMs: number | null;
  /** Recordings that an older ledger lacks. */
  readonly takenAgain: number;
  /** What people did to alarms that an older ledger lacks, oldest first. */
  readonly lostActs: readonly LostAct[];
}

export interface LostAct {
  readonly wallMs: number;
  readonly by: string;
  /** As people type it: 'acknowledge 12', 'note blower-1 repair'. */
  readonly command: string;
}

/** The mail server refused a message for good. */
export interface MessageFailedFacts {
  readonly kind: 'message-failed';
  readonly site: SiteFacts;
  readonly writtenMs: number;
  readonly subject: string;
  readonly recipient: string;
  readonly answer: string;
  readonly triedMs: number;
}

/** `check --mail`. */
export interface TestFacts {
  readonly site: SiteFacts;
  readonly writtenMs: number;
  readonly from: string;
  readonly to: readonly string[];
  readonly server: string;
  readonly points: number;
  readonly limits: number;
}
