import type { Generated } from 'kysely';

/**
 * The ledger's tables. Times are integer milliseconds since 1970 UTC; truth values are 0 or 1; levels are r.m.s. in
 * SI units; lists and reasons are JSON text. Surrogate ids only: what the site file calls a thing is `id_in_site`.
 */
export interface LedgerTables {
  meta: { key: string; value: string };
  config_versions: { id: Generated<number>; sha256: string; loaded_ms: number; text: string };
  machines: { id: Generated<number>; id_in_site: string; retired_ms: number | null };
  points: { id: Generated<number>; machine_id: number; id_in_site: string; retired_ms: number | null };
  bands: { id: Generated<number>; point_id: number; id_in_site: string; retired_ms: number | null };
  limits: {
    id: Generated<number>;
    point_id: number;
    band_id: number;
    id_in_site: string;
    retired_ms: number | null;
  };
  sources: SourcesTable;
  attempts: AttemptsTable;
  seen_files: SeenFilesTable;
  recordings: RecordingsTable;
  measurements: MeasurementsTable;
  series: SeriesTable;
  levels: LevelsTable;
  peaks: PeaksTable;
  spectra: SpectraTable;
  point_arrivals: PointArrivalsTable;
  machine_states: { machine_id: number; state: string; used_ms: number | null; version: number };
  alarm_states: AlarmStatesTable;
  alarms: AlarmsTable;
  journal: JournalTable;
  to_tell: ToTellTable;
  threads: ThreadsTable;
  messages: MessagesTable;
  deliveries: DeliveriesTable;
  summaries: {
    local_date: string;
    created_ms: number;
    message_id: number | null;
    html: string;
    facts: string;
  };
  /** Things told once (a new name pattern, channels nobody claims), by key. */
  told_once: { key: string; wall_ms: number };
}

/** Where files of one kind come from: one logger's series of names. Its clock offset belongs here. */
export interface SourcesTable {
  id: Generated<number>;
  name: string;
  /** used = stated + this; 0 unless a clock trouble stands. */
  clock_offset_ms: number;
  newest_stated_ms: number | null;
  newest_used_ms: number | null;
  last_arrived_ms: number | null;
  /** Files in a row without a stated start whose content was seen before. */
  repeats_in_a_row: number;
}

/** Files whose analysis was begun and not ended: what stopped the service is found here at the next start. */
export interface AttemptsTable {
  /** dev:inode:size:mtime of the file. */
  file_key: string;
  file_name: string;
  begun_ms: number;
  unfinished: number;
}

/** after_reading: keep. */
export interface SeenFilesTable {
  path: string;
  size_bytes: number;
  mtime_ms: number;
  ctime_ms: number;
  recording_id: number | null;
}

export interface RecordingsTable {
  id: Generated<number>;
  /** Hash of (content, sidecar, source, stated start); unique among the taken ones. */
  identity: string;
  source_id: number | null;
  content_sha256: string;
  sidecar_sha256: string | null;
  stated_ms: number | null;
  start_origin: string | null;
  arrived_ms: number;
  used_ms: number | null;
  file_name: string;
  size_bytes: number;
  duration_s: number | null;
  sample_rate_hz: number | null;
  channel_count: number | null;
  config_version_id: number;
  /** taken | repeat | quarantined | unassigned */
  outcome: string;
  reason: string | null;
  /** 1: took part in detection in its turn; 0: late, repeated content, not running. */
  evaluated: number;
  /** JSON list of recording-wide quality findings. */
  quality: string;
  /** Path relative to the drop folder, and relative to the data folder (drop-folder-relative where kept). */
  filing_from: string;
  filing_to: string | null;
  /** pending | filed */
  filing_state: string;
}

export interface MeasurementsTable {
  id: Generated<number>;
  recording_id: number;
  point_id: number;
  settings_fingerprint: string;
  is_current: number;
  used_ms: number;
  channel: string;
  sample_rate_hz: number;
  duration_s: number;
  speed_rpm: number | null;
  speed_origin: string | null;
  speed_uncertainty_rpm: number | null;
  load_percent: number | null;
  /** running | stopped | transient */
  machine_state: string;
  evaluated: number;
  mean: number | null;
  rms: number | null;
  peak: number | null;
  crest_factor: number | null;
  kurtosis: number | null;
  skewness: number | null;
  window: string | null;
  overlap_percent: number | null;
  segment_samples: number | null;
  line_spacing_hz: number | null;
  averages: number | null;
  effective_averages: number | null;
  used_percent: number | null;
  segment_spread: number | null;
  /** JSON list of {flag, detail}. */
  quality: string;
}

export interface SeriesTable {
  id: Generated<number>;
  point_id: number;
  band_id: number;
  fingerprint: string;
  quantity: string;
  from_hz: number;
  to_hz: number;
  began_ms: number;
}

/** Key order is what trends are read in: (point, used time, band, series), without rowid. */
export interface LevelsTable {
  point_id: number;
  used_ms: number;
  band_id: number;
  series_id: number;
  measurement_id: number;
  level: number;
  interval_low: number;
  interval_high: number;
  exceeded_by_80_percent: number | null;
  at_least: number;
  /** 1: belongs to the trend; 0: machine stopped or transient, late twin, repeated content. */
  in_trend: number;
}

export interface PeaksTable {
  measurement_id: number;
  rank: number;
  frequency_hz: number;
  level: number;
  above_floor_db: number;
  kind: string;
  order_of_speed: number | null;
}

export interface SpectraTable {
  measurement_id: number;
  point_id: number;
  used_ms: number;
  line_spacing_hz: number;
  /** Float32, little-endian, one-sided density in (SI unit)²/Hz. */
  density: Uint8Array;
  /** 1 where an alarm of the point changed with this recording: never thinned. */
  at_alarm: number;
}

export interface PointArrivalsTable {
  point_id: number;
  last_arrived_ms: number;
  newest_used_ms: number | null;
  newest_evaluated_used_ms: number | null;
  /** Recordings taken since the ledger began. */
  recordings: number;
}

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
  /** Names the event for ever; the Message-ID is made from it. */
  identity: string;
  wall_ms: number;
  message_id: number | null;
  /** 1: belongs to a backlog and is told in one catch-up mail if it is over by then. */
  from_backlog: number;
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
