import type { EvidenceFacts } from '../advisory/evidence-facts.ts';
import { speaksForFault } from '../manipulation/evidence.ts';
import { evidenceOf } from '../store/evidence.ts';
import type { Reader } from '../store/lent-connection.ts';
import { newestMeasurement } from '../store/read-measurements.ts';

/** What a measurement's lines say of the machine's parts, for messages: what cannot be told apart says nothing. */
export async function evidenceFacts(reader: Reader, measurementId: number): Promise<EvidenceFacts[]> {
  const evidence = await evidenceOf(reader, measurementId);
  return evidence.filter(speaksForFault).map(({ grade, words }) => ({ grade, words }));
}

/** The same of a point's newest recording that was judged. */
export async function newestEvidence(reader: Reader, pointId: number): Promise<EvidenceFacts[]> {
  const newest = await newestMeasurement(reader, pointId, { evaluated: true });
  return newest === null ? [] : evidenceFacts(reader, newest.id);
}
