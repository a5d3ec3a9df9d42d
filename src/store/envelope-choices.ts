import type { EnvelopeChoice } from '../manipulation/envelope-choice.ts';
import { jsonOfFinite } from './journal.ts';
import type { Reader, Writer } from './lent-connection.ts';

/** Choices of demodulation bands, by point; points without one are missing. */
export async function envelopeChoices(
  reader: Reader,
  pointIds: readonly number[],
): Promise<Map<number, EnvelopeChoice>> {
  if (pointIds.length === 0) return new Map();
  const rows = await reader
    .selectFrom('envelope_choices')
    .selectAll()
    .where('point_id', 'in', pointIds)
    .execute();
  return new Map(rows.map((row) => [row.point_id, JSON.parse(row.choice) as EnvelopeChoice]));
}

export async function saveEnvelopeChoice(
  writer: Writer,
  pointId: number,
  choice: EnvelopeChoice,
): Promise<void> {
  const row = { choice: jsonOfFinite(choice) };
  await writer
    .insertInto('envelope_choices')
    .values({ point_id: pointId, ...row })
    .onConflict((conflict) => conflict.column('point_id').doUpdateSet(row))
    .execute();
}
