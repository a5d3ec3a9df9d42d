import { gaussianFrom, type Noise, seededBits } from '../../src/cli/demo/noise.ts';

/** A seeded source of numbers: the same seed gives the same sequence on every machine. Uniform ones have 53 random bits. */
export type SeededRandom = Noise;

export function seededRandom(seed: number): SeededRandom {
  const bits = seededBits(seed);
  const uniform = (): number => {
    const high = bits() >>> 5;
    const low = bits() >>> 6;
    return (high * 67108864 + low) / 9007199254740992;
  };
  return { uniform, gaussian: gaussianFrom(uniform) };
}

/** `count` samples of white Gaussian noise of the given standard deviation. */
export function gaussianNoise(random: SeededRandom, count: number, deviation = 1): Float64Array {
  return Float64Array.from({ length: count }, () => deviation * random.gaussian());
}
