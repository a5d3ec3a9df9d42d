import type { Insertable } from 'kysely';
import type { Measurement, SpectralPeak } from '../manipulation/measurement.ts';
import { jsonOfFinite } from './journal.ts';
import type { Writer } from './lent-connection.ts';
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
  /** Took part in detection in its turn. */
  readonly evaluated: boolean;
  /** Belongs to the trend; false: machine stopped or transient, late twin, repeated content. */
  readonly inTrend: boolean;
  /** An alarm of the point changed with it: its spectrum is never thinned. */
  readonly atAlarm: boolean;
}

/** Rows of one insert; 40 rows of the widest table stay far below SQLite's 32,766 variables. */
const rowsAtOnce = 64;

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
  await insertPeaks(writer, stored.id, measurement.peaks);
  await insertSpectrum(writer, entry, { pointId, measurementId: stored.id });
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
      in_trend: entry.inTrend ? 1 : 0,
    };
  });
  for (const chunk of chunks(rows)) {
    await writer
      .insertInto('levels')
      .values(chunk)
      .onConflict((conflict) =>
        conflict
          .columns(['point_id', 'used_ms', 'band_id', 'series_id'])
          .doUpdateSet((to) => ({
            measurement_id: to.ref('excluded.measurement_id'),
            level: to.ref('excluded.level'),
            interval_low: to.ref('excluded.interval_low'),
            interval_high: to.ref('excluded.interval_high'),
            exceeded_by_80_percent: to.ref('excluded.exceeded_by_80_percent'),
            at_least: to.ref('excluded.at_least'),
            in_trend: to.ref('excluded.in_trend'),
          }))
          // Of two recordings at one time, one that is out of the trend never displaces one that is in it.
          .where((where) =>
            where.or([
              where('excluded.in_trend', '>=', where.ref('levels.in_trend')),
              where('excluded.measurement_id', '=', where.ref('levels.measurement_id')),
            ]),
          ),
      )
      .execute();
  }
}

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

async function insertPeaks(
  writer: Writer,
  measurementId: number,
  peaks: readonly SpectralPeak[],
): Promise<void> {
  await writer.deleteFrom('peaks').where('measurement_id', '=', measurementId).execute();
  const rows = peaks.map((peak, index) => ({
    measurement_id: measurementId,
    rank: index + 1,
    frequency_hz: peak.frequencyHz,
    level: peak.level,
    above_floor_db: peak.aboveFloorDb,
    kind: peak.kind,
    order_of_speed: peak.order,
  }));
  for (const chunk of chunks(rows)) await writer.insertInto('peaks').values(chunk).execute();
}

function* chunks<T>(rows: readonly T[]): Generator<readonly T[]> {
  for (let from = 0; from < rows.length; from += rowsAtOnce) yield rows.slice(from, from + rowsAtOnce);
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
    effective_averages: averaging?.effectiveAverages ?? null,
    used_percent: averaging?.usedPercent ?? null,
    segment_spread: averaging?.segmentSpread ?? null,
    confidence_percent: measurement.levels[0]?.confidencePercent ?? null,
    quality: jsonOfFinite(measurement.quality),
  };
}
