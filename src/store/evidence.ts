import type { Evidence } from '../manipulation/evidence.ts';
import { jsonOfFinite } from './journal.ts';
import type { Reader, Writer } from './lent-connection.ts';

/** What a measurement said of the machine's parts replaces what an earlier run of the same settings had stored. */
export async function insertEvidence(
  writer: Writer,
  measurementId: number,
  evidence: readonly Evidence[],
): Promise<void> {
  await writer.deleteFrom('evidence').where('measurement_id', '=', measurementId).execute();
  if (evidence.length === 0) return;
  await writer
    .insertInto('evidence')
    .values(
      evidence.map((one, index) => ({
        measurement_id: measurementId,
        rank: index + 1,
        part: one.partId,
        fault: one.fault,
        grade: one.grade,
        evidence: jsonOfFinite(one),
      })),
    )
    .execute();
}

/** In the order in which it was found. */
export async function evidenceOf(reader: Reader, measurementId: number): Promise<Evidence[]> {
  const rows = await reader
    .selectFrom('evidence')
    .select('evidence')
    .where('measurement_id', '=', measurementId)
    .orderBy('rank')
    .execute();
  return rows.map(({ evidence }) => JSON.parse(evidence) as Evidence);
}
