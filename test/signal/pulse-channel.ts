import type { SeededRandom } from './random.ts';

export interface PulseChannel {
  readonly sampleRateHz: number;
  readonly seconds: number;
  /** Turns made until a time, in seconds; grows. */
  readonly turnsAt: (time: number) => number;
  readonly pulsesPerTurn?: number;
  /** Part of a pulse interval that a pulse lasts. */
  readonly duty?: number;
  readonly low?: number;
  readonly high?: number;
  readonly noise?: number;
  /** Numbers of the pulses that the sensor does not see, and that it sees twice. */
  readonly missed?: ReadonlySet<number>;
  readonly doubled?: ReadonlySet<number>;
}

/** What a sensor beside a shaft gives: rectangular pulses whose edges a real cable rounds over about a sample. */
export function pulseChannel(channel: PulseChannel, random: SeededRandom): Float64Array {
  const { sampleRateHz, seconds, turnsAt, pulsesPerTurn = 1, duty = 0.2 } = channel;
  const { low = 0, high = 5, noise = 0, missed, doubled } = channel;
  const parts = 8;
  return Float64Array.from({ length: Math.round(seconds * sampleRateHz) }, (_, n) => {
    let up = 0;
    for (let part = 0; part < parts; part++) {
      const pulses = turnsAt((n + (part + 0.5) / parts - 0.5) / sampleRateHz) * pulsesPerTurn;
      const number = Math.floor(pulses);
      const phase = pulses - number;
      const isUp = phase < duty && !missed?.has(number);
      const isGhost = doubled?.has(number) === true && phase > 1.5 * duty && phase < 2 * duty;
      if (isUp || isGhost) up += 1 / parts;
    }
    return low + (high - low) * up + noise * random.gaussian();
  });
}
