import { gaussianNoise, seededRandom } from '../signal/random.ts';

/** Invented signals as a 16-bit recorder sees them: fractions of full scale. */
export const sampleRateHz = 12_800;

export interface HealthySignal {
  /** Samples, rounded to 16 bits. */
  readonly samples: Float64Array;
  readonly speedHz: number;
}

/**
 * A healthy machine seen by an accelerometer: the shaft's multiples, one higher tone, noise; speed, levels and how far
 * the recorder is driven by chance.
 */
export function healthySignal(seed: number, seconds = 1, shaftHz: number | null = null): HealthySignal {
  const random = seededRandom(seed);
  const count = Math.round(seconds * sampleRateHz);
  const speedHz = shaftHz ?? 8 + 42 * random.uniform();
  const samples = gaussianNoise(random, count, 10 ** (-0.5 - 1.2 * random.uniform()));
  const tones = [
    { hz: speedHz, size: 0.1 + 0.9 * random.uniform() },
    { hz: 2 * speedHz, size: random.uniform() },
    { hz: 3 * speedHz, size: 0.5 * random.uniform() },
    { hz: 200 + 3000 * random.uniform(), size: random.uniform() },
  ];
  for (const { hz, size } of tones) {
    const phase = 2 * Math.PI * random.uniform();
    for (let n = 0; n < count; n++)
      samples[n] += size * Math.sin((2 * Math.PI * hz * n) / sampleRateHz + phase);
  }
  const largest = samples.reduce((most, value) => Math.max(most, Math.abs(value)), 0);
  const driven = 10 ** (-0.05 - 2 * random.uniform());
  return { samples: quantised(samples.map((value) => (driven * value) / largest)), speedHz };
}

/** Rounded to the codes of an integer recorder and kept within them. */
export function quantised(samples: Float64Array, bits = 16): Float64Array {
  const codes = 2 ** (bits - 1);
  return samples.map((value) => Math.max(-codes, Math.min(codes - 1, Math.round(value * codes))) / codes);
}
