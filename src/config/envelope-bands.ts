import { envelopeAveraging } from '../signal/envelope.ts';
import { leastBandLines } from '../signal/window.ts';
import { type BandCase, type BandFinding, edgesHz, inBandUnit } from './bands.ts';
import { fixedDemodulation, type PointEnvelope } from './envelope-settings.ts';
import { printFrequency, printNumber } from './print-value.ts';
import type { Band } from './site.ts';

/**
 * What makes the level of a band of the envelope doubtful. The envelope is told from folding up to half the demodulated bandwidth; each segment's mean, which is large in an
 * envelope, is taken off and with it the lowest lines.
 */
export function judgeEnvelopeBand(band: Band, situation: BandCase): BandFinding[] {
  const { analysis, sampleRateHz, mounting, shown, runningSpeedHz, envelope } = situation;
  const edges = edgesHz(band, runningSpeedHz);
  if (edges === null || envelope == null) return [];
  const [fromHz, toHz] = edges;
  const demodulated =
    sampleRateHz === null ? envelope.band : fixedDemodulation(envelope, sampleRateHz, mounting);
  const least = leastBandLines(analysis.window);
  const spacingHz = spacingOf(envelope, situation);
  const lowestHz = least * spacingHz;
  const written = (hz: number, rounding: (value: number) => number) =>
    inBandUnit(band, hz, runningSpeedHz, rounding);
  const findings: BandFinding[] = [];
  const refuse = (edge: 'from' | 'to', rule: string, what: string, instead: string | null, right = '') =>
    findings.push({
      refused: true,
      edge,
      rule,
      what: `envelope band '${band.id}' of ${shown} ${what}`,
      right,
      instead,
    });
  if (demodulated !== null && toHz > ((demodulated.toHz - demodulated.fromHz) / 2) * (1 + 1e-9)) {
    const half = (demodulated.toHz - demodulated.fromHz) / 2;
    const of = `half the width of the demodulated band from ${printFrequency(demodulated.fromHz)} to ${printFrequency(demodulated.toHz)}`;
    refuse(
      'to',
      'beyond envelope',
      `ends at ${printFrequency(toHz)}, above ${of}`,
      written(half, Math.floor),
    );
  }
  const lines = (toHz - fromHz) / spacingHz;
  if (lines < least * (1 - 1e-9)) {
    const wide = `is ${printNumber(lines)} lines of ${printFrequency(spacingHz)} wide, ${analysis.window} needs ${least}`;
    refuse('to', 'too narrow', wide, null, `write: to: ${written(fromHz + lowestHz, Math.ceil)}`);
  }
  if (fromHz < lowestHz * (1 - 1e-9)) {
    const low = `begins ${printNumber(fromHz / spacingHz)} lines of ${printFrequency(spacingHz)} above 0, ${analysis.window} needs ${least}`;
    refuse('from', 'too low', low, null, `write: from: ${written(lowestHz, Math.ceil)}`);
  }
  return findings;
}

/** Line spacing that the envelope will have; the asked one where the sample rate is not known. */
function spacingOf(envelope: PointEnvelope, { sampleRateHz, mounting, analysis }: BandCase): number {
  const band = sampleRateHz === null ? null : fixedDemodulation(envelope, sampleRateHz, mounting);
  if (band === null || sampleRateHz === null) return envelope.lineSpacingHz;
  const { window, overlapPercent } = analysis;
  const { lineSpacingHz } = envelope;
  const { averaging } = envelopeAveraging({
    ...band,
    sampleRateHz,
    highestHz: 0,
    window,
    overlapPercent,
    lineSpacingHz,
  });
  return averaging.sampleRateHz / averaging.segmentSamples;
}
