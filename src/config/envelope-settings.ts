import { narrowestBandHz } from '../signal/demodulation.ts';
import { mountingRangeHz } from './bands.ts';
import type { Point, Quantity } from './site.ts';

/** How the envelope of a point is made; part of the frozen `Site`. */
export interface PointEnvelope {
  /** Demodulation band as written, Hz; null: the usual one, which depends on the recording's sample rate. */
  readonly band: DemodulationBand | null;
  /** `kurtosis`: that band holds until recordings have shown a better one. */
  readonly choose: 'fixed' | 'kurtosis';
  /** Widest distance between two lines of the envelope's spectrum. */
  readonly lineSpacingHz: number;
  /** Highest frequency of the envelope for which a band asks; 0 without such bands. */
  readonly highestHz: number;
  /** Up to here harmonics of bearing faults are looked for; left out: the point hears no rolling bearing. */
  readonly faultsToHz?: number;
}

export interface DemodulationBand {
  readonly fromHz: number;
  readonly toHz: number;
}

/** Where shocks are heard: the structure rings at kilohertz, and a displacement hardly moves there. */
const demodulated: readonly Quantity[] = ['acceleration', 'velocity', 'sound-pressure'];

export function hasEnvelope(quantity: Quantity): boolean {
  return demodulated.includes(quantity);
}

/** Each edge of the demodulation filter reaches this part of the band's width beyond it. */
const beyondEdge = 1 / 32;

/** Highest frequency at which a band may be demodulated: sample rate / 2.56, and the range of the sensor's mounting. */
export function highestDemodulatedHz(sampleRateHz: number, mounting: Point['mounting']): number {
  const filtered = sampleRateHz / 2.56;
  return mounting === null ? filtered : Math.min(filtered, mountingRangeHz[mounting]);
}

/** The band where the site file names none: 2 to 8 kHz, or the upper three quarters of what rate and mounting allow. */
export function usualDemodulation(sampleRateHz: number, mounting: Point['mounting']): DemodulationBand {
  const toHz = Math.min(8000, highestDemodulatedHz(sampleRateHz, mounting));
  return { fromHz: Math.min(2000, toHz / 4), toHz };
}

/** The band that holds at a sample rate without a choice by kurtosis; null where the rate is too low for it. */
export function fixedDemodulation(
  { band }: Pick<PointEnvelope, 'band'>,
  sampleRateHz: number,
  mounting: Point['mounting'],
): DemodulationBand | null {
  const found = band ?? usualDemodulation(sampleRateHz, mounting);
  return canDemodulate(found, sampleRateHz) ? found : null;
}

export function canDemodulate({ fromHz, toHz }: DemodulationBand, sampleRateHz: number): boolean {
  const beyond = beyondEdge * (toHz - fromHz);
  return (
    toHz - fromHz >= narrowestBandHz(sampleRateHz) && fromHz > beyond && toHz + beyond < sampleRateHz / 2
  );
}

/** Turns of the slowest shaft for which a segment of the envelope is long: tells its faults from each other. */
const turnsOfSegment = 25;

/** Widest line spacing that tells the faults of a shaft apart, never wider than the plain spectrum's. */
export function envelopeSpacingHz(lineSpacingHz: number, slowestShaftHz: number | null): number {
  return slowestShaftHz === null ? lineSpacingHz : Math.min(lineSpacingHz, slowestShaftHz / turnsOfSegment);
}
