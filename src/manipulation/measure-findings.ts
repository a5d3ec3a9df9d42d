import type { QualityFinding } from '../acquisition/recording.ts';
import { segmentOf } from '../config/meaning.ts';
import { printSeconds } from '../config/print-value.ts';
import type { Point } from '../config/site.ts';
import { isWrongRate } from './fingerprint.ts';
import type { UnlaidBand } from './point-bands.ts';

/**
 * A time step that differs from the mean one by more makes a spectrum wrong: a tone at a quarter of the rate then lies
 * a twelfth of a radian off. What comes from the rounding of written times is not counted by the reader.
 */
export const unevenStepRatio = 0.05;

export interface MeasureOutcome {
  readonly point: Point;
  readonly sampleRateHz: number | null;
  /** Of the stretch that was measured. */
  readonly samples: number;
  /** As `SamplesEnd` has it; above `unevenStepRatio` there is no spectrum. */
  readonly timeStepDeviation: number | null;
  readonly hasSpectrum: boolean;
  readonly unlaid: readonly UnlaidBand[];
  /** What varied from segment to segment, in words. */
  readonly unsteady: string | null;
}

/** What the measuring itself has to say: a wrong rate, uneven time, too short, bands that could not be laid, unsteady. */
export function measureFindings(outcome: MeasureOutcome): QualityFinding[] {
  const { point, sampleRateHz, timeStepDeviation } = outcome;
  const found: QualityFinding[] = [];
  const configured = point.recordings.sampleRateHz;
  if (sampleRateHz === null) {
    const detail = 'neither the file nor the site file says the sample rate; set sample_rate';
    return [{ flag: 'wrong-rate', detail }];
  }
  if (isWrongRate(sampleRateHz, configured)) {
    const detail = `recorded at ${sampleRateHz} Hz, the site file says ${configured} Hz; analysed at the recording's own`;
    found.push({ flag: 'wrong-rate', detail });
  }
  if (timeStepDeviation !== null && timeStepDeviation > unevenStepRatio) {
    const percent = Math.round(100 * timeStepDeviation);
    const detail = `time steps differ from their mean by up to ${percent} %; waveform values only`;
    return [...found, { flag: 'uneven-time', detail }];
  }
  if (!outcome.hasSpectrum) return [...found, tooShort(outcome, sampleRateHz)];
  for (const { flag, reason } of outcome.unlaid) found.push({ flag, detail: reason });
  if (outcome.unsteady !== null) found.push({ flag: 'unsteady', detail: outcome.unsteady });
  return found;
}

function tooShort({ point, samples }: MeasureOutcome, sampleRateHz: number): QualityFinding {
  const needed = segmentOf(point.analysis, sampleRateHz);
  const has = printSeconds(samples / sampleRateHz);
  const wants = printSeconds(needed / sampleRateHz);
  return {
    flag: 'too-short',
    detail: `${has} without a gap, one segment needs ${wants}; waveform values only. Record longer or widen line_spacing`,
  };
}
