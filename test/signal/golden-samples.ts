/** How samples for the golden values are made; names as in the JSON that test/golden/make_golden.py writes. */
export interface GoldenInput {
  readonly seed: number;
  readonly noise_scale: number;
  readonly tone_scale: number;
  readonly offset: number;
  /** Added a sample. */
  readonly drift?: number;
}

/** The same samples, bit for bit, as `samples` in test/golden/make_golden.py: integers scaled by powers of two. */
export function goldenSamples(count: number, input: GoldenInput): Float64Array {
  const full = 2 ** 19;
  let state = input.seed;
  let phaseA = 0;
  let phaseB = 0;
  const { drift = 0 } = input;
  return Float64Array.from({ length: count }, (_, n) => {
    state = (Math.imul(1664525, state) + 1013904223) >>> 0;
    const noise = (state >>> 12) - full;
    phaseA = (phaseA + 91403) % 2 ** 20;
    phaseB = (phaseB + 7001) % 2 ** 20;
    const tone = 8 * (2 * Math.abs(phaseA - full) - full) + 2 * Math.abs(phaseB - full) - full;
    return input.offset + noise * input.noise_scale + tone * input.tone_scale + n * drift;
  });
}
