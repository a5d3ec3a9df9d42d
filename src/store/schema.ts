import type { Generated } from 'kysely';
import type {
  AlarmStatesTable,
  AlarmsTable,
  DeliveriesTable,
  FloodsTable,
  JournalTable,
  MessagesTable,
  OutOfServiceTable,
  ThreadsTable,
  ToTellTable,
} from './alarm-tables.ts';
import type {
  BaselinesTable,
  ConditionsTable,
  DailyLevelsTable,
  DayMarksTable,
  NotesTable,
} from './baseline-tables.ts';
import type { EnvelopeChoicesTable, EnvelopeSpectraTable, EnvelopesTable } from './envelope-tables.ts';
import type { OpenPoolsTable } from './pooling.ts';

/**
 * The ledger's tables. Times are integer milliseconds since 1970 UTC; truth values are 0 or 1; levels are r.m.s. in
 * SI units; lists and reasons are JSON text. Surrogate ids only: what the site file calls a thing is `id_in_site`.
 */
export interface LedgerTables {
  meta: { key: string; value: string };
  /** One row a migration that is done; the ledger's version is the greatest number. */
  migrations: { number: number; name: string; done_ms: number };
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
  evidence: EvidenceTable;
  spectra: SpectraTable;
  envelopes: EnvelopesTable;
  envelope_peaks: PeaksTable;
  envelope_spectra: EnvelopeSpectraTable;
  envelope_choices: EnvelopeChoicesTable;
  /** Recordings that wait to be averaged together, one row a point. */
  open_pools: OpenPoolsTable;
  point_arrivals: PointArrivalsTable;
  conditions: ConditionsTable;
  daily_levels: DailyLevelsTable;
  day_marks: DayMarksTable;
  baselines: BaselinesTable;
  notes: NotesTable;
  machine_states: { machine_id: number; state: string; used_ms: number | null; version: number };
  alarm_states: AlarmStatesTable;
  alarms: AlarmsTable;
  out_of_service: OutOfServiceTable;
  journal: JournalTable;
  to_tell: ToTellTable;
  floods: FloodsTable;
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
  /** Arrival of the newest recording that was evaluated. */
  last_evaluated_arrived_ms: number | null;
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
  quantity: string;
  /** SI unit of the quantity. */
  unit: string;
  sample_rate_hz: number;
  duration_s: number;
  speed_rpm: number | null;
  speed_origin: string | null;
  speed_uncertainty_rpm: number | null;
  load_percent: number | null;
  /** The sidecar's own word. */
  running_said: number | null;
  /** running | stopped | transient */
  machine_state: string;
  /** Operating condition by its id in the site file, '' where the machine lists none; null: outside all, or not running. */
  condition: string | null;
  /** Hours that the machine has run since the ledger knows it. */
  running_hours: number | null;
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
  /** Recordings pooled in these averages; null: the one. */
  pooled_recordings: number | null;
  /** 1: its spectrum is in a pool, whose levels a later recording has; else null. */
  waits: number | null;
  effective_averages: number | null;
  used_percent: number | null;
  segment_spread: number | null;
  /** Of the intervals of its levels. */
  confidence_percent: number | null;
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
  condition_id: number;
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
  /** JSON list; null: none. */
  names: string | null;
}

export interface EvidenceTable {
  measurement_id: number;
  rank: number;
  /** Id of the part in the site file. */
  part: string;
  fault: string;
  /** weak | clear | strong | not separable */
  grade: string;
  /** JSON: everything that the assessment said. */
  evidence: string;
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
  /** 'peak-hold': the highest of all segments; null: their mean. */
  averaging: string | null;
}

export interface PointArrivalsTable {
  point_id: number;
  last_arrived_ms: number;
  newest_used_ms: number | null;
  newest_evaluated_used_ms: number | null;
  /** Recordings taken since the ledger began. */
  recordings: number;
}
