import type { EnvelopeMeasured } from '../manipulation/envelope-measured.ts';
import type { SpectralPeak, Spectrum } from '../manipulation/measurement.ts';
import type { Reader, Writer } from './lent-connection.ts';
import { insertPeaks, storedPeak } from './peaks.ts';
import { densityBytes, densityOf } from './spectra.ts';

/** Stores the envelope of a measurement; what an earlier run had stored of it gives way. */
export async function insertEnvelope(
  writer: Writer,
  measurementId: number,
  envelope: EnvelopeMeasured | null,
): Promise<void> {
  for (const table of ['envelopes', 'envelope_peaks', 'envelope_spectra'] as const)
    await writer.deleteFrom(table).where('measurement_id', '=', measurementId).execute();
  if (envelope === null) return;
  const { averaging, spectrum } = envelope;
  await writer
    .insertInto('envelopes')
    .values({
      measurement_id: measurementId,
      from_hz: envelope.fromHz,
      to_hz: envelope.toHz,
      chosen: envelope.chosen,
      line_spacing_hz: envelope.lineSpacingHz,
      segment_samples: averaging.segmentSamples,
      averages: averaging.averages,
      effective_averages: averaging.effectiveAverages,
      used_percent: averaging.usedPercent,
    })
    .execute();
  await insertPeaks(writer, 'envelope_peaks', measurementId, envelope.peaks);
  await writer
    .insertInto('envelope_spectra')
    .values({
      measurement_id: measurementId,
      line_spacing_hz: spectrum.lineSpacingHz,
      density: densityBytes(spectrum.density),
    })
    .execute();
}

/** A stored envelope; its spectrum is null once it was thinned. */
export interface StoredEnvelope {
  readonly fromHz: number;
  readonly toHz: number;
  readonly chosen: 'fixed' | 'kurtosis';
  readonly lineSpacingHz: number;
  readonly segmentSamples: number;
  readonly averages: number;
  readonly effectiveAverages: number;
  readonly usedPercent: number;
  readonly peaks: readonly SpectralPeak[];
  readonly spectrum: Spectrum | null;
}

/** The envelope of a measurement; null where it has none. */
export async function envelopeOf(reader: Reader, measurementId: number): Promise<StoredEnvelope | null> {
  const row = await reader
    .selectFrom('envelopes')
    .selectAll()
    .where('measurement_id', '=', measurementId)
    .executeTakeFirst();
  if (row === undefined) return null;
  const peaks = await reader
    .selectFrom('envelope_peaks')
    .selectAll()
    .where('measurement_id', '=', measurementId)
    .orderBy('rank')
    .execute();
  const spectrum = await reader
    .selectFrom('envelope_spectra')
    .selectAll()
    .where('measurement_id', '=', measurementId)
    .executeTakeFirst();
  return {
    fromHz: row.from_hz,
    toHz: row.to_hz,
    chosen: row.chosen as StoredEnvelope['chosen'],
    lineSpacingHz: row.line_spacing_hz,
    segmentSamples: row.segment_samples,
    averages: row.averages,
    effectiveAverages: row.effective_averages,
    usedPercent: row.used_percent,
    peaks: peaks.map(storedPeak),
    spectrum:
      spectrum === undefined
        ? null
        : { lineSpacingHz: spectrum.line_spacing_hz, density: densityOf(spectrum.density) },
  };
}
