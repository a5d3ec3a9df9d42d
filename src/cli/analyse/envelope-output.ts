import { printFrequency, printNumber } from '../../config/print-value.ts';
import type { EnvelopeMeasured } from '../../manipulation/envelope-measured.ts';
import type { SpectralPeak } from '../../manipulation/measurement.ts';

/** The envelope as JSON; `spectrum` adds its density up to half the width of the demodulated band. */
export function envelopeJson(
  envelope: EnvelopeMeasured,
  unit: string,
  peakJson: (peak: SpectralPeak, unit: string) => unknown,
  spectrum: boolean,
) {
  const { averaging, candidate } = envelope;
  return {
    from_hz: envelope.fromHz,
    to_hz: envelope.toHz,
    chosen: envelope.chosen,
    line_spacing_hz: envelope.lineSpacingHz,
    averages: averaging.averages,
    effective_averages: averaging.effectiveAverages,
    candidate: candidate && {
      from_hz: candidate.fromHz,
      to_hz: candidate.toHz,
      kurtosis: candidate.kurtosis,
      noise_point: candidate.noisePoint,
      passes: candidate.passes,
    },
    peaks: envelope.peaks.map((peak) => peakJson(peak, unit)),
    ...(spectrum
      ? {
          spectrum: {
            line_spacing_hz: envelope.spectrum.lineSpacingHz,
            unit: `(${unit})²/Hz`,
            density: Array.from(envelope.spectrum.density),
          },
        }
      : {}),
  };
}

/** How the envelope was made, for people. */
export function envelopeText({
  fromHz,
  toHz,
  chosen,
  averaging,
  candidate,
  lineSpacingHz,
}: EnvelopeMeasured): string {
  const { averages, effectiveAverages } = averaging;
  const words = [
    `of ${band(fromHz, toHz)}${chosen === 'kurtosis' ? ', chosen by kurtosis' : ''}`,
    `a line every ${printFrequency(lineSpacingHz)}`,
    `${averages} ${averages === 1 ? 'average' : 'averages'}, worth ${printNumber(effectiveAverages)} independent`,
  ];
  if (candidate !== null) {
    const point = `kurtosis ${printNumber(candidate.kurtosis)}, noise gives up to ${printNumber(candidate.noisePoint)}`;
    words.push(
      candidate.passes
        ? `no band is chosen yet; shocks stand out most in ${band(candidate.fromHz, candidate.toHz)} (${point})`
        : `no band is chosen: shocks stand out of none (most in ${band(candidate.fromHz, candidate.toHz)}: ${point})`,
    );
  }
  return words.join('; ');
}

function band(fromHz: number, toHz: number): string {
  return `${printFrequency(fromHz)} to ${printFrequency(toHz)}`;
}
