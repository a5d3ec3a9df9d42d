import type { Selectable } from 'kysely';
import type { SpectralPeak } from '../manipulation/measurement.ts';
import type { Writer } from './lent-connection.ts';
import { insertRows } from './many-rows.ts';
import type { PeaksTable } from './schema.ts';

const columns = [
  'measurement_id',
  'rank',
  'frequency_hz',
  'level',
  'above_floor_db',
  'kind',
  'order_of_speed',
  'names',
] as const satisfies readonly (keyof PeaksTable)[];

/** Peaks of a measurement's spectrum or of its envelope, strongest first; those of an earlier run give way. */
export async function insertPeaks(
  writer: Writer,
  table: 'peaks' | 'envelope_peaks',
  measurementId: number,
  peaks: readonly SpectralPeak[],
): Promise<void> {
  await writer.deleteFrom(table).where('measurement_id', '=', measurementId).execute();
  const rows = peaks.map(
    (peak, index): PeaksTable => ({
      measurement_id: measurementId,
      rank: index + 1,
      frequency_hz: peak.frequencyHz,
      level: peak.level,
      above_floor_db: peak.aboveFloorDb,
      kind: peak.kind,
      order_of_speed: peak.order,
      names: peak.names.length === 0 ? null : JSON.stringify(peak.names),
    }),
  );
  await insertRows(writer, table, columns, rows);
}

export function storedPeak(row: Selectable<PeaksTable>): SpectralPeak {
  return {
    frequencyHz: row.frequency_hz,
    level: row.level,
    aboveFloorDb: row.above_floor_db,
    kind: row.kind as SpectralPeak['kind'],
    order: row.order_of_speed,
    names: row.names === null ? [] : (JSON.parse(row.names) as string[]),
  };
}
