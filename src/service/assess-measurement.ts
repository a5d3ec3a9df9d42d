import { type AssessedSpectrum, assess } from '../assessment/assess.ts';
import type { Part } from '../config/parts.ts';
import type { Measurement } from '../manipulation/measurement.ts';

/** Lines of a spectrum per turn of the shaft from which a fault of pooled bursts is named. */
const leastLinesATurn = 25;

/**
 * The same of pooled recordings, where their lines are fine enough: pooling adds averages, never resolution, so no fault
 * is named while the line spacing exceeds 1/25 of the shaft speed.
 */
export function assessedPool(
  measurement: Measurement,
  partsOfMachine: readonly Part[] | undefined,
): Measurement {
  const { averaging, envelope, speed } = measurement;
  const spacingHz = Math.max(averaging?.lineSpacingHz ?? 0, envelope?.lineSpacingHz ?? 0);
  if (speed === null || leastLinesATurn * spacingHz > speed.rpm / 60) return measurement;
  return assessed(measurement, partsOfMachine);
}

/**
 * The measurement with names on its peaks, and with what its lines say of the parts that its point hears. One that is to
 * be pooled is left as it is: the pool is what speaks.
 */
export function assessed(measurement: Measurement, partsOfMachine: readonly Part[] | undefined): Measurement {
  const { averaging, envelope, peaks, pointId, sampleRateHz, speed } = measurement;
  const parts = partsOfMachine ?? [];
  const heard = parts.filter(({ at }) => at.includes(pointId));
  if (heard.length === 0 || averaging === null || measurement.share !== undefined) return measurement;
  const { lineSpacingHz } = averaging;
  const plain: AssessedSpectrum = { kind: 'plain', peaks, lineSpacingHz, toHz: sampleRateHz / 2 };
  if (envelope == null) {
    const found = assess([plain], speed, heard, parts);
    return { ...measurement, peaks: found.peaks[0] ?? peaks, evidence: found.evidence };
  }
  const demodulated: AssessedSpectrum = {
    kind: 'envelope',
    peaks: envelope.peaks,
    lineSpacingHz: envelope.lineSpacingHz,
    toHz: (envelope.toHz - envelope.fromHz) / 2,
  };
  // The envelope first: it is where a bearing is heard soonest.
  const found = assess([demodulated, plain], speed, heard, parts);
  return {
    ...measurement,
    envelope: { ...envelope, peaks: found.peaks[0] ?? envelope.peaks },
    peaks: found.peaks[1] ?? peaks,
    evidence: found.evidence,
  };
}
