import type { WindowName } from '../signal/window.ts';
import type { AnalysisSettings } from './analysis-settings.ts';
import type { PointEnvelope } from './envelope-settings.ts';
import type { HowOften } from './how-often.ts';
import type { Delay, Limit, LimitKind, LimitReasons } from './limit.ts';
import type { MachineZones, SensorPlace } from './machine-zones.ts';
import type { MailServer, MailSettings, Recipient, ReminderSettings } from './mail-settings.ts';
import type { Part } from './parts.ts';
import type { SampleLayout } from './sample-layout.ts';
import type { SpeedSettings } from './speed-settings.ts';

/**
 * The frozen Site: what a site file means, in SI units, with ids as written. Everything else reads this.
 * Levels and limits are r.m.s. in the SI unit of their quantity (m/s², m/s, m); times are milliseconds;
 * display units stand beside them.
 */

/** Quantities that the integration chain knows, and others that are trended as they are. */
export type Quantity =
  | 'acceleration'
  | 'velocity'
  | 'displacement'
  | 'sound-pressure'
  | 'voltage'
  | 'current'
  | 'other';

/** r.m.s.; derived peak = sqrt 2 r.m.s.; derived peak to peak = 2 sqrt 2 r.m.s. */
export type Detector = 'rms' | 'peak' | 'peak-to-peak';

/** A unit as people read it, of one quantity, and its size in the SI unit of that quantity. */
export interface SampleUnit {
  readonly text: string;
  readonly quantity: Quantity;
  readonly inSi: number;
}

/** A unit with the detector in which a band is shown: `text` is e.g. 'mm/s' or 'mil peak to peak (derived)'. */
export interface DisplayUnit extends SampleUnit {
  readonly detector: Detector;
  /** Shown in decibels re this, in SI; left out: as a number of the unit. */
  readonly decibelReference?: number;
}

export type { AnalysisSettings, WindowName };

export interface Site {
  readonly name: string;
  /** IANA name. */
  readonly timeZone: string;
  /** Absolute path of the site file, and the SHA-256 of its text: the config version of every decision. */
  readonly file: string;
  readonly configVersion: string;
  readonly folders: {
    readonly drop: string;
    readonly data: string;
    readonly afterReading: 'archive' | 'keep' | 'delete';
  };
  readonly machines: readonly Machine[];
  readonly mail: MailSettings | null;
  readonly summary: { readonly at: TimeOfDay; readonly to: readonly Recipient[] } | null;
  readonly page: { readonly host: string; readonly port: number } | null;
  readonly timings: IntakeTimings;
  /** The longest time for which a person can shelve an alarm. */
  readonly shelveAtMostMs: number;
  /** New alarms that one person can see to; left out: five a week. */
  readonly alarmBudget?: HowOften;
  /** Largest file that intake accepts. */
  readonly largestFileBytes: number;
  /** Problems that do not stop the service (an overlap above 75 %, a band above the mounting's range). */
  readonly warnings: readonly SiteRemark[];
}

export interface SiteRemark {
  readonly line: number;
  readonly column: number;
  readonly text: string;
}

export interface TimeOfDay {
  readonly hour: number;
  readonly minute: number;
}

/** Waits of intake; all on the monotonic clock. */
export interface IntakeTimings {
  readonly incompleteAfterMs: number;
  readonly unassignedAfterMs: number;
  readonly clockToleranceMs: number;
  readonly backlogQuietMs: number;
  readonly backlogWaitMs: number;
  readonly sweepEveryMs: number;
  /** Look for files by polling (network shares) instead of by the system's events. */
  readonly polling: boolean;
}

export interface Machine {
  readonly id: string;
  readonly name: string;
  readonly area: string | null;
  readonly type: string | null;
  readonly formerly: readonly string[];
  readonly runningSpeedHz: number | null;
  /** How the running speed of a recording is found. */
  readonly speed: SpeedSettings;
  readonly running: RunningRule | null;
  readonly afterStartMs: number;
  readonly stoppedExpectedMs: number;
  readonly criticality: 'A' | 'B' | 'C';
  readonly like: readonly string[];
  /** Operating conditions in which levels are compared, the first that fits; none: all running is one. */
  readonly conditions?: readonly OperatingCondition[];
  /** The part of a published table that holds for it. */
  readonly zones?: MachineZones | null;
  /** Without it: none. */
  readonly parts?: readonly Part[];
  readonly points: readonly Point[];
}

/** A class of speed and load; null: any. Both ends belong to it. */
export interface OperatingCondition {
  readonly id: string;
  readonly speedHz: { readonly from: number; readonly to: number } | null;
  readonly loadPercent: { readonly from: number; readonly to: number } | null;
}

/** When a machine counts as running. `level`: two points must agree; threshold in SI r.m.s. */
export type RunningRule =
  | { readonly by: 'speed'; readonly aboveRpm: number }
  | { readonly by: 'sidecar' }
  | { readonly by: 'level'; readonly bandId: string; readonly above: number };

export interface Point {
  readonly machineId: string;
  readonly id: string;
  readonly name: string;
  readonly formerly: readonly string[];
  readonly direction: string | null;
  readonly mounting: 'stud' | 'glue' | 'magnet' | 'hand' | null;
  /** null: on a bearing housing, on the shaft where displacement is measured. */
  readonly sensorOn?: SensorPlace | null;
  /** A number from 1, or a column name. */
  readonly channel: number | string;
  readonly quantity: Quantity;
  readonly signal: SignalSettings;
  readonly recordings: RecordingSettings;
  readonly analysis: AnalysisSettings;
  /** Left out: nothing asks for it. */
  readonly envelope?: PointEnvelope;
  readonly bands: readonly Band[];
  readonly limits: readonly Limit[];
}

export interface SignalSettings {
  readonly samplesIn: SampleUnit;
  /** Value, in `samplesIn`, of the largest integer sample; null: samples are taken as they stand. */
  readonly fullScale: number | null;
  /** Volts (SI of samplesIn) per SI unit of the point's quantity; null: samples are the quantity itself. */
  readonly sensitivity: number | null;
  readonly sensitivityText: string | null;
}

export interface RecordingSettings {
  /** File pattern as written: `<any>`, `<machine>`, `<point>`, `/`; or a regular expression in RE2 syntax. */
  readonly files: string | null;
  readonly filesRegex: string | null;
  /** `<year><month><day>T<hour><minute><second>Z`-like pattern found anywhere in the name; null: not in the name. */
  readonly startInName: string | null;
  /** What the logger's clock shows. `offset`: minutes east of UTC. */
  readonly clock:
    | { readonly kind: 'utc' }
    | { readonly kind: 'site' }
    | { readonly kind: 'offset'; readonly minutes: number };
  readonly ignore: readonly string[];
  readonly sampleRateHz: number | null;
  readonly durationS: number | null;
  readonly expectedEveryMs: number;
  readonly overdueAfterMs: number;
  readonly settleMs: number;
  readonly sidecar: 'none' | 'optional' | 'expected';
  /** Left out: nothing is said of it. */
  readonly layout?: SampleLayout;
}

export interface Band {
  readonly id: string;
  readonly formerly: readonly string[];
  /** Left out: of the plain spectrum. */
  readonly of?: 'envelope';
  readonly quantity: Quantity;
  /** Hz, or orders of the running speed where `inOrders`. */
  readonly from: number;
  readonly to: number;
  readonly inOrders: boolean;
  readonly display: DisplayUnit;
}

export type { Delay, Limit, LimitKind, LimitReasons, MailServer, MailSettings, Recipient, ReminderSettings };

export type Severity = 'trouble' | 'alert' | 'danger';

/** `machine/point`, the way people name a point on the command line and in mails. */
export function pointPath(point: { readonly machineId: string; readonly id: string }): string {
  return `${point.machineId}/${point.id}`;
}
