import { gaussianNoise, type SeededRandom } from './random.ts';

export interface HiddenImpacts {
  readonly sampleRateHz: number;
  readonly durationS: number;
  readonly impactsPerS: number;
  /** Frequency at which each impact rings, and half the bandwidth of its decay. */
  readonly resonanceHz: number;
  readonly halfWidthHz: number;
  /** Of the impacts against the noise, both over all frequencies. */
  readonly aboveNoiseDb: number;
  /** Spread of the distance from one impact to the next, as a part of it: a rolling element slips. */
  readonly slip: number;
}

/** White noise of standard deviation 1 with decaying bursts in it, as a damaged bearing gives. */
export function hiddenImpacts(random: SeededRandom, settings: HiddenImpacts): Float64Array {
  const { sampleRateHz, durationS, impactsPerS, resonanceHz, halfWidthHz, aboveNoiseDb, slip } = settings;
  const count = Math.round(sampleRateHz * durationS);
  const impacts = new Float64Array(count);
  const decay = 2 * Math.PI * halfWidthHz;
  const ringing = Math.ceil((8 * sampleRateHz) / decay);
  for (let at = random.uniform() / impactsPerS; at < durationS; ) {
    const first = Math.ceil(at * sampleRateHz);
    for (let n = first; n < Math.min(count, first + ringing); n++) {
      const t = n / sampleRateHz - at;
      impacts[n] += Math.exp(-decay * t) * Math.sin(2 * Math.PI * resonanceHz * t);
    }
    at += (1 + slip * random.gaussian()) / impactsPerS;
  }
  const power = impacts.reduce((sum, value) => sum + value * value, 0) / count;
  const scale = Math.sqrt(10 ** (aboveNoiseDb / 10) / power);
  const noise = gaussianNoise(random, count);
  return noise.map((value, n) => value + scale * impacts[n]);
}
