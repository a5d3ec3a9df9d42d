import type { Spectrum } from '../manipulation/measurement.ts';
import type { Reader, Writer } from './lent-connection.ts';
import type { NewMeasurement } from './trends.ts';

/** Where the rows of one measurement belong. */
export interface Place {
  readonly pointId: number;
  readonly measurementId: number;
}

export async function insertSpectrum(writer: Writer, entry: NewMeasurement, place: Place): Promise<void> {
  const { spectrum } = entry.measurement;
  await writer.deleteFrom('spectra').where('measurement_id', '=', place.measurementId).execute();
  if (spectrum === null) return;
  await writer
    .insertInto('spectra')
    .values({
      measurement_id: place.measurementId,
      point_id: place.pointId,
      used_ms: entry.usedMs,
      at_alarm: entry.atAlarm ? 1 : 0,
      line_spacing_hz: spectrum.lineSpacingHz,
      density: densityBytes(spectrum.density),
    })
    .execute();
}

/** An alarm of the point changed with this measurement: its spectrum is kept for good. */
export async function keepSpectrum(writer: Writer, measurementId: number): Promise<void> {
  await writer
    .updateTable('spectra')
    .set({ at_alarm: 1 })
    .where('measurement_id', '=', measurementId)
    .execute();
}

/** Float32, little-endian, whatever machine writes it. */
export function densityBytes(density: Float32Array): Uint8Array {
  const bytes = new Uint8Array(density.length * 4);
  const view = new DataView(bytes.buffer);
  for (const [index, value] of density.entries()) {
    if (!Number.isFinite(value))
      throw new Error(`density at line ${index} is ${value}, which is never stored`);
    view.setFloat32(index * 4, value, true);
  }
  return bytes;
}

export interface StoredSpectrum extends Spectrum {
  readonly measurementId: number;
  readonly usedMs: number;
}

/** The newest spectra of a point before a time (without it: of all), newest first. */
export async function newestSpectra(
  reader: Reader,
  pointId: number,
  page: { readonly beforeMs?: number; readonly limit: number },
): Promise<StoredSpectrum[]> {
  let query = reader.selectFrom('spectra').selectAll().where('point_id', '=', pointId);
  if (page.beforeMs !== undefined) query = query.where('used_ms', '<', page.beforeMs);
  const rows = await query
    .orderBy('used_ms', 'desc')
    .orderBy('measurement_id', 'desc')
    .limit(page.limit)
    .execute();
  return rows.map((row) => ({
    measurementId: row.measurement_id,
    usedMs: row.used_ms,
    lineSpacingHz: row.line_spacing_hz,
    density: densityOf(row.density),
  }));
}

export function densityOf(bytes: Uint8Array): Float32Array {
  const view = new DataView(bytes.buffer, bytes.byteOffset, bytes.byteLength);
  return Float32Array.from({ length: bytes.byteLength / 4 }, (_, index) => view.getFloat32(index * 4, true));
}
