import { Kurtogram, type KurtogramResult, type KurtogramSettings } from '../../src/signal/kurtogram.ts';
import { hiddenImpacts } from './hidden-impacts.ts';
import { gaussianNoise, seededRandom } from './random.ts';

const settings: KurtogramSettings = {
  sampleRateHz: 25_600,
  lowestHz: 500,
  highestHz: 10_000,
  narrowestHz: 800,
};

export function kurtogramOf(
  samples: Float64Array,
  changed: Partial<KurtogramSettings> = {},
): KurtogramResult {
  const kurtogram = new Kurtogram({ ...settings, ...changed });
  kurtogram.add(samples);
  return kurtogram.finish();
}

/** In how many of so many recordings of 10 s a band that rings 10 dB below the noise is found, above its noise point. */
export function bandsFound(impactsPerS: number, trials: number): number {
  let found = 0;
  for (let trial = 0; trial < trials; trial++) {
    const random = seededRandom(1000 * impactsPerS + trial);
    const resonanceHz = 2000 + 7000 * random.uniform();
    const { best, passes } = kurtogramOf(
      hiddenImpacts(random, {
        sampleRateHz: settings.sampleRateHz,
        durationS: 10,
        impactsPerS,
        resonanceHz,
        halfWidthHz: 150,
        aboveNoiseDb: -10,
        slip: 0.01,
      }),
    );
    if (passes && best !== null && best.fromHz <= resonanceHz && resonanceHz <= best.toHz) found++;
  }
  return found;
}

/** How many recordings of nothing but noise have a band above its noise point. */
export function noisePassing(trials: number, durationS: number, seed: number): number {
  const random = seededRandom(seed);
  let passing = 0;
  for (let trial = 0; trial < trials; trial++) {
    if (kurtogramOf(gaussianNoise(random, Math.round(durationS * settings.sampleRateHz))).passes) passing++;
  }
  return passing;
}
