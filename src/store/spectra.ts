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
      averaging: spectrum.averaging ?? null,
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

const littleEndianHere = new Uint8Array(Uint16Array.of(1).buffer)[0] === 1;

/** Float32, little-endian, whatever machine writes it. */
export function densityBytes(density: Float32Array): Uint8Array {
  for (let line = 0; line < density.length; line++) {
    const value = density[line];
    if (!Number.isFinite(value))
      throw new Error(`density at line ${line} is ${value}, which is never stored`);
  }
  const bytes = new Uint8Array(density.buffer, density.byteOffset, density.byteLength).slice();
  return littleEndianHere ? bytes : swapped(bytes);
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
    ...(row.averaging === 'peak-hold' ? { averaging: 'peak-hold' as const } : {}),
  }));
}

export function densityOf(bytes: Uint8Array): Float32Array {
  const own = new Uint8Array(bytes);
  return new Float32Array((littleEndianHere ? own : swapped(own)).buffer);
}

/** Float64, little-endian: what numbers are still made from. */
export function doubleBytes(density: Float64Array): Uint8Array {
  if (!density.every(Number.isFinite)) throw new Error('a density that is not finite is never stored');
  const bytes = new Uint8Array(density.buffer, density.byteOffset, density.byteLength).slice();
  return littleEndianHere ? bytes : swapped(bytes, 8);
}

export function doublesOf(bytes: Uint8Array): Float64Array {
  const own = new Uint8Array(bytes);
  return new Float64Array((littleEndianHere ? own : swapped(own, 8)).buffer);
}

/** Each group of so many bytes turned round, in place. */
function swapped(bytes: Uint8Array<ArrayBuffer>, size = 4): Uint8Array<ArrayBuffer> {
  for (let at = 0; at < bytes.length; at += size) bytes.subarray(at, at + size).reverse();
  return bytes;
}
