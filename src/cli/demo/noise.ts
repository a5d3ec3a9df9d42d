/** Seeded noise of the demo: the same seed gives the same recordings on every machine. */
export interface Noise {
  /** Uniform in [0, 1). */
  uniform(): number;
  /** Gaussian, mean 0, standard deviation 1. */
  gaussian(): number;
}

export function seededNoise(seed: number): Noise {
  const bits = seededBits(seed);
  const uniform = () => bits() / 4294967296;
  return { uniform, gaussian: gaussianFrom(uniform) };
}

/**
 * Numbers of 32 random bits by xoshiro128** (Blackman and Vigna 2021), started by splitmix32. Any integer serves as a
 * seed; neighbouring seeds give unrelated sequences.
 */
export function seededBits(seed: number): () => number {
  // The high half of seeds beyond 32 bits (for example a time in ms) is mixed in as well.
  let mix = ((seed >>> 0) ^ Math.imul(Math.floor(Math.abs(seed) / 2 ** 32) >>> 0, 0x27d4eb2f)) >>> 0;
  const next32 = () => {
    mix = (mix + 0x9e3779b9) >>> 0;
    let z = mix;
    z = Math.imul(z ^ (z >>> 16), 0x85ebca6b);
    z = Math.imul(z ^ (z >>> 13), 0xc2b2ae35);
    return (z ^ (z >>> 16)) >>> 0;
  };
  let [a, b, c, d] = [next32(), next32(), next32(), next32()];
  return () => {
    const result = Math.imul(rotate(Math.imul(b, 5), 7), 9) >>> 0;
    const shifted = b << 9;
    c ^= a;
    d ^= b;
    b ^= c;
    a ^= d;
    c ^= shifted;
    d = rotate(d, 11);
    return result;
  };
}

function rotate(x: number, by: number): number {
  return (x << by) | (x >>> (32 - by));
}

/** Gaussian numbers, mean 0 and variance 1, from uniform ones by Marsaglia's polar method (1964). */
export function gaussianFrom(uniform: () => number): () => number {
  let spare: number | null = null;
  return () => {
    if (spare !== null) {
      const value = spare;
      spare = null;
      return value;
    }
    for (;;) {
      const u = 2 * uniform() - 1;
      const v = 2 * uniform() - 1;
      const s = u * u + v * v;
      if (s > 0 && s < 1) {
        const scale = Math.sqrt((-2 * Math.log(s)) / s);
        spare = v * scale;
        return u * scale;
      }
    }
  };
}
