import type { Reader } from './lent-connection.ts';

/** r.m.s. (SI, about the mean) of a point's newest unflagged recordings while its machine ran, newest first. */
export async function lastGoodRms(reader: Reader, pointId: number, limit: number): Promise<number[]> {
  const rows = await reader
    .selectFrom('measurements')
    .select('rms')
    .where('point_id', '=', pointId)
    .where('machine_state', '=', 'running')
    .where('quality', '=', '[]')
    .where('rms', 'is not', null)
    .orderBy('used_ms', 'desc')
    .limit(limit)
    .execute();
  return rows.flatMap(({ rms }) => (rms === null ? [] : [rms]));
}
