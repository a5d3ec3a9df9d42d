/** A seeded source of numbers: the same seed gives the same sequence on every machine. */
export interface SeededRandom {
  /** Uniform in [0, 1), 53 random bits. */
  uniform(): number;
  /** Standard Gaussian: mean 0, variance 1. */
  gaussian(): number;
}

/**
 * xoshiro128** (Blackman & Vigna 2021) started by splitmix32; Gaussian numbers by Marsaglia's polar method (1964).
 * Any integer serves as a seed; neighbouring seeds give unrelated sequences.
 */
export function seededRandom(seed: number): SeededRandom {
  let mixed = seed >>> 0;
  const splitmix = (): number => {
    mixed = (mixed + 0x9e3779b9) >>> 0;
    let z = mixed;
    z = Math.imul(z ^ (z >>> 16), 0x85ebca6b);
    z = Math.imul(z ^ (z >>> 13), 0xc2b2ae35);
    return (z ^ (z >>> 16)) >>> 0;
  };
  // High half of seeds beyond 32 bits (for example a time in ms) is mixed in as well.
  mixed = (mixed ^ Math.imul(Math.floor(Math.abs(seed) / 2 ** 32) >>> 0, 0x27d4eb2f)) >>> 0;
  let a = splitmix();
  let b = splitmix();
  let c = splitmix();
  let d = splitmix();

  const next = (): number => {
    const times5 = Math.imul(b, 5);
    const result = Math.imul((times5 << 7) | (times5 >>> 25), 9) >>> 0;
    const shifted = b << 9;
    c ^= a;
    d ^= b;
    b ^= c;
    a ^= d;
    c ^= shifted;
    d = (d << 11) | (d >>> 21);
    return result;
  };
  const uniform = (): number => {
    const high = next() >>> 5;
    const low = next() >>> 6;
    return (high * 67108864 + low) / 9007199254740992;
  };

  let spare = Number.NaN;
  const gaussian = (): number => {
    if (!Number.isNaN(spare)) {
      const kept = spare;
      spare = Number.NaN;
      return kept;
    }
    for (;;) {
      const u = 2 * uniform() - 1;
      const v = 2 * uniform() - 1;
      const s = u * u + v * v;
      if (s > 0 && s < 1) {
        const factor = Math.sqrt((-2 * Math.log(s)) / s);
        spare = v * factor;
        return u * factor;
      }
    }
  };

  return { uniform, gaussian };
}

/** `count` samples of white Gaussian noise of the given standard deviation. */
export function gaussianNoise(random: SeededRandom, count: number, deviation = 1): Float64Array {
  return Float64Array.from({ length: count }, () => deviation * random.gaussian());
}
