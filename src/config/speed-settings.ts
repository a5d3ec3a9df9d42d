/** How the running speed of each recording of a machine is found, where no sidecar says it. */
export interface SpeedSettings {
  /** How far from the declared speed the spectrum is searched for another; null: never. */
  readonly findWithinPercent: number | null;
  readonly pulses: PulseSettings | null;
}

/** A channel of a machine's files that gives pulses of its shaft. */
export interface PulseSettings {
  /** A number from 1, or a column name. */
  readonly channel: number | string;
  readonly pulsesPerTurn: number;
  /** Null: halfway between the channel's two levels. */
  readonly thresholdV: number | null;
}

export const usualSpeed: SpeedSettings = { findWithinPercent: 5, pulses: null };
