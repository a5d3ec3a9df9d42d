import type { QualityFinding } from '../acquisition/recording.ts';
import type { ZoneChange } from '../assessment/zone-change.ts';
import type { DisplayUnit, LimitReasons, Machine, Severity } from '../config/site.ts';
import type { ZoneBoundaries, ZoneLetter } from '../config/zone-tables.ts';
import type { AlarmStanding, JournalEventName, TroubleKind } from '../detection/alarm.ts';
import type { Averaging, RunningSpeed } from '../manipulation/measurement.ts';
import type { AlarmCharts } from './alarm-pictures.ts';
import type { Picture } from './charts/picture.ts';
import type { EvidenceFacts } from './evidence-facts.ts';
import type { ChatterFacts } from './history-words.ts';
import type { Change } from './ranking.ts';
import type { ReminderFacts, WasAcknowledged } from './reminder-facts.ts';
import type { TrendFacts } from './trend-words.ts';

/**
 * What messages are made from: plain data, read from the ledger by the service and turned into words here.
 * Levels are r.m.s. in the SI unit of their quantity and are shown in the display unit beside them; times are
 * milliseconds since 1970 UTC and are shown in the site's zone. Names come as the site file has them: they are
 * made harmless when they are written, never before. null always means 'there is none'.
 */

export interface SiteFacts {
  readonly name: string;
  readonly timeZone: string; // IANA name
}

export interface MachineFacts {
  readonly id: string;
  readonly name: string;
  readonly criticality: Machine['criticality'];
}

export interface PointFacts {
  readonly id: string;
  readonly name: string;
  /** As in the site file; takes part in putting several directions of one bearing into one line. */
  readonly direction: string | null;
}

export interface BandFacts {
  readonly id: string;
  /** Edges in Hz as evaluated (orders already multiplied by the speed). */
  readonly fromHz: number;
  readonly toHz: number;
  readonly display: DisplayUnit;
}

export interface LimitFacts {
  readonly id: string;
  readonly side: 'upper' | 'lower';
  /** SI r.m.s.; at least one of the two is set, but where the limit cannot be reckoned. */
  readonly alert: number | null;
  readonly danger: number | null;
  /** Why they stand there; left out where the site says so. */
  readonly reasons?: LimitReasons | null;
  /** SI r.m.s.: what is held against it, where that is not the level itself (a rate: its line's level now). */
  readonly compared?: number;
  /** Reckoned from a baseline that is still provisional. */
  readonly provisional?: boolean;
  /** Who stands for the baseline, which had been refused or was frozen. */
  readonly confirmedBy?: string;
  /** Why it cannot be reckoned now. */
  readonly unknown?: string;
}

/** The evaluation zone of a level of velocity or displacement. */
export interface ZoneFacts {
  /** null: no zone; `why` says the reason. */
  readonly letter: ZoneLetter | null;
  readonly why: string | null;
  /** Of a clipped recording: this zone or a worse one. */
  readonly atLeast: boolean;
  /** 'ISO 20816-3 (group 2, rigid)'. */
  readonly table: string;
  /** SI r.m.s.; null where none hold. */
  readonly boundaries: Pick<ZoneBoundaries, 'ab' | 'bc' | 'cd'> | null;
  /** Against the earlier level named with it. */
  readonly change: (ZoneChange & { readonly since: 'baseline' | 'week' }) | null;
  /** The machine's zone, where another of its points is in a worse one. */
  readonly machine: { readonly letter: ZoneLetter; readonly point: PointFacts } | null;
}

/** A level with what stands behind it. SI r.m.s. */
export interface LevelFacts {
  readonly usedMs: number;
  readonly level: number;
  readonly intervalLow: number;
  readonly intervalHigh: number;
  readonly confidencePercent: number;
  /** Clipped or saturated: the true level is at least this. */
  readonly atLeast: boolean;
}

/** A level of the past, without its interval. SI r.m.s. */
export interface PastLevel {
  readonly usedMs: number;
  readonly level: number;
}

/** What alarms and troubles share. */
export interface StandingFacts {
  /** 0: it has none, because its alarm never stood (a level over its limit in a recording that came late). */
  readonly number: number;
  readonly standing: AlarmStanding;
  /** Used time of the first recording over the limit, or when the trouble began. */
  readonly sinceMs: number;
  /** Recordings over the limit, or files concerned, in this life; 0 where nothing is counted. */
  readonly recordings: number;
  /** The wall time by which the site wants a response: `respond_within` after the first telling not yet acknowledged. */
  readonly respondByMs: number | null;
  readonly acknowledgedBy: string | null;
  readonly acknowledgedMs: number | null;
  /** Shelved or out of service until. */
  readonly suppressedUntilMs: number | null;
  /** Who shelved it or took it out of service, and why; by design: the condition of the site file that holds. */
  readonly suppressedBy?: string | null;
  readonly suppressedWhy?: string | null;
  readonly untoldDanger?: boolean; // it rose to danger while it was held back
}

/** An alarm as every list of alarms shows it. */
export interface StandingAlarm extends StandingFacts {
  readonly kind: 'alarm';
  readonly severity: Exclude<Severity, 'trouble'>;
  readonly machine: MachineFacts;
  readonly point: PointFacts;
  readonly band: BandFacts;
  readonly limit: LimitFacts;
  /** In the summary the newest level, null when there is none; in an alarm mail the one that caused it. */
  readonly level: LevelFacts | null;
  /** Over the danger limit in the newest recording, on-delay still running. */
  readonly dangerUnconfirmed: boolean;
  /** What the lines of the recording that the level is of say of the machine's parts. */
  readonly evidence: readonly EvidenceFacts[];
  readonly change: Change | null;
  /** The site's own words of what to do. */
  readonly action: string | null;
}

/** A trouble: of a point, of a machine, of a logger (source), or of the site (all three null). */
export interface TroubleFacts extends StandingFacts {
  readonly kind: 'trouble';
  readonly trouble: TroubleKind;
  readonly machine: MachineFacts | null;
  readonly point: PointFacts | null;
  /** The logger's series of files. */
  readonly source: string | null;
  /** One line of what was found (a refusal's reason, a file name, the mail server's answer). */
  readonly detail: string | null;
  /** When something usable last came from there. */
  readonly lastGoodMs: number | null;
  /** Overdue only: how often a recording is expected. */
  readonly expectedEveryMs: number | null;
  /** 'returned' where the mail tells that it is over. */
  readonly event: JournalEventName;
  readonly reminder?: ReminderFacts;
}

/** Everything the alarm mail says of one alarm. */
export interface AlarmFacts extends StandingAlarm {
  readonly level: LevelFacts;
  /** What this mail tells: raised, rose, said-again, exceeded-came-late, limit-removed, ... */
  readonly event: JournalEventName;
  readonly reminder?: ReminderFacts;
  readonly wasAcknowledged?: WasAcknowledged;
  /** Where the machine has a zone table and the band is of a quantity that it may judge. */
  readonly zone: ZoneFacts | null;
  readonly before: {
    /** Up to four, newest first, without the present one. */
    readonly last: readonly PastLevel[];
    readonly dayBefore: PastLevel | null;
    readonly weekBefore: PastLevel | null;
    /** SI r.m.s. */
    readonly baseline: number | null;
    /** A repair or another sensor, before which no level is compared with this one. */
    readonly broken?: { readonly kind: 'repair' | 'sensor-changed'; readonly atMs: number } | null;
  };
  /** Set in the one mail that tells that it comes and goes. */
  readonly chattering?: ChatterFacts | null;
  /** What the daily levels before say; null: there is no level that it could be of. */
  readonly trend: TrendFacts | null;
  readonly charts?: AlarmCharts;
  readonly lines: LinesFacts | null;
  readonly otherPoints: readonly OtherPointFacts[];
  readonly recording: RecordingFacts;
}

/** Spectral lines now against about a week ago; made by `compareLines`. */
export interface LinesFacts {
  /** Unit in which a line's level is shown; of the point's quantity. */
  readonly display: DisplayUnit;
  /** Used time of the earlier spectrum; null: there is none to compare with. */
  readonly comparedWithMs: number | null;
  readonly lines: readonly LineFacts[];
}

export interface LineFacts {
  readonly frequencyHz: number;
  readonly order: number | null;
  /** What may make it; see `SpectralPeak`. */
  readonly names: readonly string[];
  /** SI r.m.s. of the line; null: it no longer stands out. */
  readonly level: number | null;
  /** The same then; null: it did not stand out. */
  readonly levelBefore: number | null;
}

/** Another point of the machine: its band that uses most of its alert limit. */
export interface OtherPointFacts {
  readonly point: PointFacts;
  readonly band: BandFacts | null;
  readonly level: LevelFacts | null;
  /** Share of the alert limit, 1 = at the limit; see `shareOfAlert`. */
  readonly share: number | null;
}

export interface RecordingFacts {
  readonly fileName: string | null;
  readonly startMs: number;
  readonly arrivedMs: number;
  /** `backlog`: one of several that came together after a pause; `late`: starts before a newer evaluated one. */
  readonly arrival: 'in-time' | 'backlog' | 'late';
  readonly durationS: number;
  readonly speed: RunningSpeed | null;
  readonly loadPercent: number | null;
  readonly averaging: Averaging | null;
  readonly quality: readonly QualityFinding[];
}

/** One gathered mail of one machine; machine null: troubles of the logger, the files or the service. */
export interface AlarmMailFacts {
  readonly site: SiteFacts;
  readonly machine: MachineFacts | null;
  readonly writtenMs: number;
  readonly alarms: readonly AlarmFacts[];
  readonly troubles: readonly TroubleFacts[];
  /** Subject of the thread that runs; null in its first mail and when the severity has risen since. */
  readonly threadSubject: string | null;
  /** Made by `check --mail --as-alarm`: marked TEST, nothing to acknowledge. */
  readonly test: boolean;
}

/** What leaves: the same content twice, for programs that show HTML and for those that do not. */
export interface Mail {
  /** One line, at most 150 characters, no control characters. */
  readonly subject: string;
  readonly text: string;
  readonly html: string;
  readonly pictures?: readonly Picture[];
}
