/** Seeded noise of the demo: the same seed gives the same recordings on every machine. */
export interface Noise {
  /** Uniform in [0, 1). */
  uniform(): number;
  /** Gaussian, mean 0, standard deviation 1. */
  gaussian(): number;
}

/** xoshiro128** (Blackman and Vigna 2018), seeded through splitmix32; Gaussian by Marsaglia's polar method (1964). */
export function seededNoise(seed: number): Noise {
  let mix = seed >>> 0;
  const next32 = () => {
    mix = (mix + 0x9e3779b9) >>> 0;
    let z = mix;
    z = Math.imul(z ^ (z >>> 16), 0x85ebca6b);
    z = Math.imul(z ^ (z >>> 13), 0xc2b2ae35);
    return (z ^ (z >>> 16)) >>> 0;
  };
  let [a, b, c, d] = [next32(), next32(), next32(), next32()];
  const rotate = (x: number, by: number) => (x << by) | (x >>> (32 - by));
  const uniform = () => {
    const result = Math.imul(rotate(Math.imul(b, 5), 7), 9) >>> 0;
    const shifted = b << 9;
    c ^= a;
    d ^= b;
    b ^= c;
    a ^= d;
    c ^= shifted;
    d = rotate(d, 11);
    return result / 4294967296;
  };
  let spare: number | null = null;
  const gaussian = () => {
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
  return { uniform, gaussian };
}
