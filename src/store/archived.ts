import type { Reader } from './lent-connection.ts';

/** Recordings of a point that were filed in the archive. */
export interface Archived {
  readonly count: number;
  /** Path below the data folder of the newest; null: there is none. */
  readonly newest: string | null;
}

export async function archivedOfPoint(reader: Reader, pointId: number): Promise<Archived> {
  const filed = reader
    .selectFrom('measurements')
    .innerJoin('recordings', 'recordings.id', 'measurements.recording_id')
    .where('measurements.point_id', '=', pointId)
    .where('measurements.is_current', '=', 1)
    .where('recordings.filing_state', '=', 'filed')
    .where('recordings.filing_to', 'like', 'archive/%');
  const { count } = await filed
    .select(({ fn }) => fn.countAll<number>().as('count'))
    .executeTakeFirstOrThrow();
  const newest = await filed
    .select('recordings.filing_to as path')
    .orderBy('measurements.used_ms', 'desc')
    .limit(1)
    .executeTakeFirst();
  return { count, newest: newest?.path ?? null };
}
