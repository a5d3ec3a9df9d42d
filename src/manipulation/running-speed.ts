import type { MeasuredSpeed } from './measurement.ts';

/** Uncertainty of a speed that a logger wrote down: its tachometer, and drift over the recording. */
const sidecarUncertainty = 0.005;
/** Uncertainty of a nominal speed: induction motors slip by up to about 3 % between no and full load. */
const nominalUncertainty = 0.03;

export interface SpeedQuestion {
  /** As the logger wrote it down. */
  readonly sidecarRpm: number | null;
  /** As the site file says it, Hz. */
  readonly nominalHz: number | null;
}

/** A machine's running speed in one recording, by the best source there is. */
export function runningSpeed({ sidecarRpm, nominalHz }: SpeedQuestion): MeasuredSpeed | null {
  const unchecked = { usableForNames: true, rangeRpm: null, inSpectrum: null };
  if (sidecarRpm !== null) {
    const uncertaintyRpm = sidecarUncertainty * Math.abs(sidecarRpm);
    return { rpm: sidecarRpm, origin: 'sidecar', uncertaintyRpm, ...unchecked };
  }
  if (nominalHz === null) return null;
  // The site file says r/min; what the way through hertz adds in the last digits is taken off again.
  const rpm = Number((60 * nominalHz).toPrecision(12));
  return { rpm, origin: 'nominal', uncertaintyRpm: nominalUncertainty * rpm, ...unchecked };
}
