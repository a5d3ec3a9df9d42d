import type { Insertable } from 'kysely';
import type { Measurement } from '../manipulation/measurement.ts';
import { conditionId } from './conditions.ts';
import { insertEnvelope } from './envelopes.ts';
import { insertEvidence } from './evidence.ts';
import { jsonOfFinite } from './journal.ts';
import type { Writer } from './lent-connection.ts';
import { insertRows } from './many-rows.ts';
import { insertPeaks } from './peaks.ts';
import type { LevelsTable, MeasurementsTable } from './schema.ts';
import type { SiteIds } from './site-ids.ts';
import { insertSpectrum, type Place } from './spectra.ts';

export type MachineStateName = 'running' | 'stopped' | 'transient';

/** A measurement as it enters the ledger, with what the service decided about it. */
export interface NewMeasurement {
  readonly measurement: Measurement;
  readonly recordingId: number;
  readonly usedMs: number;
  readonly machineState: MachineStateName;
  /** Operating condition, '' where the machine lists none; null: outside all, or not running. */
  readonly condition: string | null;
  /** Hours that the machine has run so far; null: not counted. */
  readonly runningHours: number | null;
  /** Took part in detection in its turn. */
  readonly evaluated: boolean;
  /** Belongs to the trend; false: machine stopped or transient, late twin, repeated content. */
  readonly inTrend: boolean;
  /** An alarm of the point changed with it: its spectrum is never thinned. */
  readonly atAlarm: boolean;
}

/**
 * Stores a measurement with its levels, peaks and spectrum; earlier ones of the same recording and point are no longer
 * current. The same settings again (a run repeated) replace what that run had stored. Returns its id.
 */
export async function insertMeasurement(
  writer: Writer,
  ids: SiteIds,
  entry: NewMeasurement,
): Promise<number> {
  const { measurement, recordingId } = entry;
  const pointId = ids.pointId(measurement.machineId, measurement.pointId);
  await writer
    .updateTable('measurements')
    .set({ is_current: 0 })
    .where('recording_id', '=', recordingId)
    .where('point_id', '=', pointId)
    .execute();
  const row = measurementRow(entry, pointId);
  const stored = await writer
    .insertInto('measurements')
    .values(row)
    .onConflict((conflict) =>
      conflict.columns(['recording_id', 'point_id', 'settings_fingerprint']).doUpdateSet(row),
    )
    .returning('id')
    .executeTakeFirstOrThrow();
  await insertLevels(writer, ids, entry, { pointId, measurementId: stored.id });
  await insertPeaks(writer, 'peaks', stored.id, measurement.peaks);
  await insertEvidence(writer, stored.id, measurement.evidence);
  await insertSpectrum(writer, entry, { pointId, measurementId: stored.id });
  await insertEnvelope(writer, stored.id, measurement.envelope ?? null);
  return stored.id;
}

async function insertLevels(
  writer: Writer,
  ids: SiteIds,
  entry: NewMeasurement,
  place: Place,
): Promise<void> {
  const { measurement, usedMs } = entry;
  if (measurement.levels.length === 0) return;
  const seriesIds = await getSeries(writer, ids, entry, place.pointId);
  const machineId = ids.machineId(measurement.machineId);
  const condition = await conditionId(writer, machineId, entry.condition ?? '');
  const rows = measurement.levels.map((level): LevelsTable => {
    if (!(level.level >= 0)) throw new Error(`${measurement.pointId} ${level.bandId}: level ${level.level}`);
    const bandId = ids.bandId(measurement.machineId, measurement.pointId, level.bandId);
    return {
      point_id: place.pointId,
      used_ms: usedMs,
      band_id: bandId,
      series_id: seriesIds.get(seriesName(bandId, level.fingerprint)) ?? Number.NaN,
      measurement_id: place.measurementId,
      level: level.level,
      interval_low: level.intervalLow,
      interval_high: level.intervalHigh,
      exceeded_by_80_percent: level.exceededBy80Percent,
      at_least: level.atLeast ? 1 : 0,
      condition_id: condition,
      in_trend: entry.inTrend ? 1 : 0,
    };
  });
  await insertRows(writer, 'levels', levelColumns, rows, levelConflict);
}

const levelColumns = [
  'point_id',
  'used_ms',
  'band_id',
  'series_id',
  'measurement_id',
  'level',
  'interval_low',
  'interval_high',
  'exceeded_by_80_percent',
  'at_least',
  'condition_id',
  'in_trend',
] as const satisfies readonly (keyof LevelsTable)[];

/** Of two recordings at one time, one that is out of the trend never displaces one that is in it. */
const levelConflict = `
  on conflict (point_id, used_ms, band_id, series_id) do update set
    measurement_id = excluded.measurement_id, level = excluded.level, interval_low = excluded.interval_low,
    interval_high = excluded.interval_high, exceeded_by_80_percent = excluded.exceeded_by_80_percent,
    at_least = excluded.at_least, condition_id = excluded.condition_id, in_trend = excluded.in_trend
  where excluded.in_trend >= levels.in_trend or excluded.measurement_id = levels.measurement_id`;

/** Ids of the series of all levels of a measurement, by `seriesName`; new settings begin a new series. */
async function getSeries(
  writer: Writer,
  ids: SiteIds,
  entry: NewMeasurement,
  pointId: number,
): Promise<Map<string, number>> {
  const { measurement } = entry;
  const fingerprints = [...new Set(measurement.levels.map((level) => level.fingerprint))];
  const known = await writer
    .selectFrom('series')
    .select(['id', 'band_id', 'fingerprint'])
    .where('point_id', '=', pointId)
    .where('fingerprint', 'in', fingerprints)
    .orderBy('id')
    .execute();
  const found = new Map(known.map((row) => [seriesName(row.band_id, row.fingerprint), row.id]));
  for (const level of measurement.levels) {
    const bandId = ids.bandId(measurement.machineId, measurement.pointId, level.bandId);
    const name = seriesName(bandId, level.fingerprint);
    if (found.has(name)) continue;
    const made = await writer
      .insertInto('series')
      .values({
        point_id: pointId,
        band_id: bandId,
        fingerprint: level.fingerprint,
        quantity: level.quantity,
        from_hz: level.fromHz,
        to_hz: level.toHz,
        began_ms: entry.usedMs,
      })
      .returning('id')
      .executeTakeFirstOrThrow();
    found.set(name, made.id);
  }
  return found;
}

function seriesName(bandId: number, fingerprint: string): string {
  return `${bandId} ${fingerprint}`;
}

function measurementRow(entry: NewMeasurement, pointId: number): Insertable<MeasurementsTable> {
  const { measurement } = entry;
  const { speed, waveform, averaging } = measurement;
  return {
    recording_id: entry.recordingId,
    point_id: pointId,
    settings_fingerprint: measurement.settingsFingerprint,
    is_current: 1,
    used_ms: entry.usedMs,
    channel: measurement.channel,
    quantity: measurement.quantity,
    unit: measurement.unit,
    sample_rate_hz: measurement.sampleRateHz,
    duration_s: measurement.durationS,
    speed_rpm: speed?.rpm ?? null,
    speed_origin: speed?.origin ?? null,
    speed_uncertainty_rpm: speed?.uncertaintyRpm ?? null,
    load_percent: measurement.loadPercent,
    running_said: measurement.runningSaid === null ? null : measurement.runningSaid ? 1 : 0,
    machine_state: entry.machineState,
    condition: entry.condition,
    running_hours: entry.runningHours,
    evaluated: entry.evaluated ? 1 : 0,
    mean: waveform?.mean ?? null,
    rms: waveform?.rms ?? null,
    peak: waveform?.peak ?? null,
    crest_factor: waveform?.crestFactor ?? null,
    kurtosis: waveform?.kurtosis ?? null,
    skewness: waveform?.skewness ?? null,
    window: averaging?.window ?? null,
    overlap_percent: averaging?.overlapPercent ?? null,
    segment_samples: averaging?.segmentSamples ?? null,
    line_spacing_hz: averaging?.lineSpacingHz ?? null,
    averages: averaging?.averages ?? null,
    pooled_recordings: averaging?.recordings ?? null,
    waits: measurement.waits === true ? 1 : null,
    effective_averages: averaging?.effectiveAverages ?? null,
    used_percent: averaging?.usedPercent ?? null,
    segment_spread: averaging?.segmentSpread ?? null,
    confidence_percent: measurement.levels[0]?.confidencePercent ?? null,
    quality: jsonOfFinite(measurement.quality),
  };
}
