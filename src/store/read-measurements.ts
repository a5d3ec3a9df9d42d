import type { Selectable } from 'kysely';
import type { QualityFinding } from '../acquisition/recording.ts';
import type { Quantity } from '../config/site.ts';
import type { Averaging, RunningSpeed, WaveformValues } from '../manipulation/measurement.ts';
import type { Reader } from './lent-connection.ts';
import { type TrendPoint, trendPoint } from './read-trends.ts';
import type { MeasurementsTable } from './schema.ts';
import type { MachineStateName } from './trends.ts';

/** A stored measurement; fields as in `Measurement`; peaks and spectrum are read by `peaksOf` and `newestSpectra`. */
export interface StoredMeasurement {
  readonly id: number;
  readonly recordingId: number;
  readonly pointId: number;
  readonly usedMs: number;
  readonly settingsFingerprint: string;
  readonly channel: string;
  readonly quantity: Quantity;
  readonly unit: string;
  readonly sampleRateHz: number;
  readonly durationS: number;
  readonly speed: RunningSpeed | null;
  readonly loadPercent: number | null;
  readonly runningSaid: boolean | null;
  readonly machineState: MachineStateName;
  readonly condition: string | null;
  readonly runningHours: number | null;
  readonly evaluated: boolean;
  readonly waveform: WaveformValues | null;
  readonly averaging: Averaging | null;
  /** Of the intervals of all its levels; null where it has no levels. */
  readonly confidencePercent: number | null;
  readonly quality: readonly QualityFinding[];
  /** By band and series. A level that gave way to another recording of the same time is not among them. */
  readonly levels: readonly TrendPoint[];
}

/**
 * The current measurement of a point with the newest used time, with its levels; null where there is none. Recordings
 * that only waited in a pool are passed over unless they are asked for.
 */
export async function newestMeasurement(
  reader: Reader,
  pointId: number,
  only: { readonly evaluated?: boolean; readonly beforeMs?: number; readonly waiting?: boolean } = {},
): Promise<StoredMeasurement | null> {
  let query = reader
    .selectFrom('measurements')
    .selectAll()
    .where('point_id', '=', pointId)
    .where('is_current', '=', 1);
  if (only.waiting !== true) query = query.where('waits', 'is', null);
  if (only.evaluated === true) query = query.where('evaluated', '=', 1);
  if (only.beforeMs !== undefined) query = query.where('used_ms', '<', only.beforeMs);
  const row = await query.orderBy('used_ms', 'desc').orderBy('id', 'desc').limit(1).executeTakeFirst();
  return row === undefined ? null : storedMeasurement(row, await levelsOf(reader, row));
}

export async function measurementById(reader: Reader, id: number): Promise<StoredMeasurement | null> {
  const row = await reader.selectFrom('measurements').selectAll().where('id', '=', id).executeTakeFirst();
  return row === undefined ? null : storedMeasurement(row, await levelsOf(reader, row));
}

/** Current measurements of a recording, by point. */
export async function measurementsOfRecording(
  reader: Reader,
  recordingId: number,
): Promise<StoredMeasurement[]> {
  const rows = await reader
    .selectFrom('measurements')
    .selectAll()
    .where('recording_id', '=', recordingId)
    .where('is_current', '=', 1)
    .orderBy('point_id')
    .execute();
  const stored: StoredMeasurement[] = [];
  for (const row of rows) stored.push(storedMeasurement(row, await levelsOf(reader, row)));
  return stored;
}

async function levelsOf(
  reader: Reader,
  of: { readonly id: number; readonly point_id: number; readonly used_ms: number },
): Promise<TrendPoint[]> {
  const rows = await reader
    .selectFrom('levels')
    .selectAll()
    .where('point_id', '=', of.point_id)
    .where('used_ms', '=', of.used_ms)
    .where('measurement_id', '=', of.id)
    .orderBy('band_id')
    .orderBy('series_id')
    .execute();
  return rows.map(trendPoint);
}

function storedMeasurement(
  row: Selectable<MeasurementsTable>,
  levels: readonly TrendPoint[],
): StoredMeasurement {
  return {
    id: row.id,
    recordingId: row.recording_id,
    pointId: row.point_id,
    usedMs: row.used_ms,
    settingsFingerprint: row.settings_fingerprint,
    channel: row.channel,
    quantity: row.quantity as Quantity,
    unit: row.unit,
    sampleRateHz: row.sample_rate_hz,
    durationS: row.duration_s,
    speed: speedOf(row),
    loadPercent: row.load_percent,
    runningSaid: row.running_said === null ? null : row.running_said === 1,
    machineState: row.machine_state as MachineStateName,
    condition: row.condition,
    runningHours: row.running_hours,
    evaluated: row.evaluated === 1,
    waveform: waveformOf(row),
    averaging: averagingOf(row),
    confidencePercent: row.confidence_percent,
    quality: JSON.parse(row.quality) as QualityFinding[],
    levels,
  };
}

function speedOf(row: Selectable<MeasurementsTable>): RunningSpeed | null {
  if (row.speed_rpm === null) return null;
  return {
    rpm: row.speed_rpm,
    origin: row.speed_origin as RunningSpeed['origin'],
    uncertaintyRpm: row.speed_uncertainty_rpm ?? 0,
  };
}

/** Written all together or not at all. */
function waveformOf(row: Selectable<MeasurementsTable>): WaveformValues | null {
  if (row.rms === null) return null;
  return {
    mean: row.mean ?? 0,
    rms: row.rms,
    peak: row.peak ?? 0,
    crestFactor: row.crest_factor ?? 0,
    kurtosis: row.kurtosis ?? 0,
    skewness: row.skewness ?? 0,
  };
}

/** Written all together or not at all. */
function averagingOf(row: Selectable<MeasurementsTable>): Averaging | null {
  if (row.window === null) return null;
  return {
    window: row.window,
    overlapPercent: row.overlap_percent ?? 0,
    segmentSamples: row.segment_samples ?? 0,
    lineSpacingHz: row.line_spacing_hz ?? 0,
    averages: row.averages ?? 0,
    ...(row.pooled_recordings === null ? {} : { recordings: row.pooled_recordings }),
    effectiveAverages: row.effective_averages ?? 0,
    usedPercent: row.used_percent ?? 0,
    segmentSpread: row.segment_spread,
  };
}
