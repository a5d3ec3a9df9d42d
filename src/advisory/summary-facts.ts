import type { BaselineState } from '../detection/baseline.ts';
import type {
  BandFacts,
  LevelFacts,
  LimitFacts,
  MachineFacts,
  PointFacts,
  SiteFacts,
  StandingAlarm,
  TroubleFacts,
  ZoneFacts,
} from './facts.ts';
import type { Change } from './ranking.ts';
import type { RepairFacts } from './repair-words.ts';
import type { SisterFacts } from './sister-words.ts';
import type { ChatteringFacts, OutOfServiceFacts } from './summary-held.ts';
import type { TrendFacts } from './trend-words.ts';

/** What the morning summary is made from; conventions as in facts.ts. */

/** A band of a point as it is now. */
export interface BandNow {
  readonly band: BandFacts;
  readonly level: LevelFacts | null;
  readonly limits: readonly LimitFacts[];
  readonly change: Change | null;
  readonly zone: ZoneFacts | null;
  /** Of bands with a limit that is reckoned from them, one an operating condition. */
  readonly baselines?: readonly BaselineNow[];
  /** Null or left out: there is no level that it could be of. */
  readonly trend?: TrendFacts | null;
  /** Null or left out: it lies among its sister machines, or has none. */
  readonly sister?: SisterFacts | null;
}

/** What is usual for a band in one operating condition, as far as limits depend on it. */
export interface BaselineNow {
  /** '' where the machine has one condition only. */
  readonly condition: string;
  readonly state: BaselineState;
  readonly runningDays: number;
  /** Why it is refused. */
  readonly refused: string | null;
  /** Who stands for it although it had been refused, or froze it. */
  readonly confirmedBy: string | null;
}

/**
 * judged: an evaluated recording within the time allowed. stopped: its machine stands. blind: a trouble stands, no
 * usable data. not-judged: data come, but none of its limits can be reckoned for them (outside every operating condition, no
 * baseline yet). no-limit: it can never alarm.
 * out-of-service: taken out by a person.
 */
export type Judging = 'judged' | 'stopped' | 'blind' | 'not-judged' | 'no-limit' | 'out-of-service';

export interface PointNow {
  readonly machine: MachineFacts;
  readonly point: PointFacts;
  readonly judging: Judging;
  /** Used time of the newest recording. */
  readonly lastMs: number | null;
  readonly bands: readonly BandNow[];
}

/** The morning. */
export interface SummaryFacts {
  readonly site: SiteFacts;
  readonly writtenMs: number;
  /** Recordings are counted from here to `writtenMs`: the last summary, or a day. */
  readonly sinceMs: number;
  /** Every point of the site, in the order of the site file. */
  readonly points: readonly PointNow[];
  /** Everything that stands or waits to be acknowledged. */
  readonly standing: readonly (StandingAlarm | TroubleFacts)[];
  /** Left out: none. */
  readonly outOfService?: readonly OutOfServiceFacts[];
  readonly chattering?: readonly ChatteringFacts[];
  /** Repairs and changed sensors whose days before and after are compared, the newest first; left out: none. */
  readonly repairs?: readonly RepairFacts[];
  /** Machines stopped for longer than `stopped_expected`. */
  readonly longStopped: readonly { readonly machine: MachineFacts; readonly sinceMs: number }[];
  /** Alarms closed since the last summary because their limit left the site file. */
  readonly limitsRemoved: readonly { readonly number: number; readonly what: string }[];
  readonly recordings: {
    readonly received: number;
    readonly expected: number;
    readonly repeats: number;
    readonly late: number;
    readonly quarantined: number;
    readonly unassigned: number;
  };
  /** Numbers given to alarms (troubles not counted). */
  readonly history: {
    readonly yesterday: number;
    readonly week: number;
    /** Most frequent of the week first. */
    readonly frequent: readonly {
      readonly machine: MachineFacts;
      readonly point: PointFacts;
      readonly count: number;
    }[];
  };
  readonly service: SummaryServiceFacts;
}

export interface SummaryServiceFacts {
  readonly upSinceMs: number;
  readonly mailWaiting: number;
  readonly mailFailed: number;
  readonly mailLastAcceptedMs: number | null;
  /** The server's last answer, where it was not an acceptance. */
  readonly mailLastAnswer: string | null;
  /** At the present rate; null: not known yet. */
  readonly diskDaysLeft: number | null;
  readonly diskFreeBytes: number | null;
  readonly lastBackupMs: number | null;
}
