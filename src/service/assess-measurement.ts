import { type AssessedSpectrum, assess } from '../assessment/assess.ts';
import type { Part } from '../config/parts.ts';
import type { Measurement } from '../manipulation/measurement.ts';

/** The measurement with names on its peaks, and with what its lines say of the parts that its point hears. */
export function assessed(measurement: Measurement, partsOfMachine: readonly Part[] | undefined): Measurement {
  const { averaging, peaks, pointId, sampleRateHz, speed } = measurement;
  const parts = partsOfMachine ?? [];
  const heard = parts.filter(({ at }) => at.includes(pointId));
  if (heard.length === 0 || averaging === null) return measurement;
  const { lineSpacingHz } = averaging;
  const plain: AssessedSpectrum = { kind: 'plain', peaks, lineSpacingHz, toHz: sampleRateHz / 2 };
  const found = assess([plain], speed, heard, parts);
  return { ...measurement, peaks: found.peaks[0] ?? peaks, evidence: found.evidence };
}
