import type { SeededRandom } from './random.ts';

export type Colour = 'white' | 'pink' | 'red' | 'low-passed';

/** Samples a filter runs before they count. */
const settling = 4000;

/**
 * Gaussian noise: white; pink, density about 1/f over four decades; red, 1/f² down to about 1e-4 of the sample rate;
 * low-passed, falling by 48 dB an octave above 0.4 of the sample rate into a floor 80 dB below, like a recorder's.
 */
export function colouredNoise(colour: Colour, random: SeededRandom, count: number): Float64Array {
  const next = filters[colour](random);
  if (colour !== 'white') for (let i = 0; i < settling; i++) next();
  return Float64Array.from({ length: count }, next);
}

const filters: Record<Colour, (random: SeededRandom) => () => number> = {
  white: (random) => () => random.gaussian(),
  // First-order sections half a decade apart, each of equal power per octave.
  pink: (random) => {
    const poles = [0.9998, 0.9994, 0.998, 0.994, 0.98, 0.94, 0.82, 0.5];
    const states = poles.map(() => 0);
    return () => {
      let sum = 0;
      for (let k = 0; k < poles.length; k++) {
        states[k] = poles[k] * states[k] + Math.sqrt(1 - poles[k]) * random.gaussian();
        sum += states[k];
      }
      return sum;
    };
  },
  red: (random) => {
    let state = 0;
    return () => {
      state = 0.9995 * state + random.gaussian();
      return state;
    };
  },
  // Butterworth, order 8, corner at 0.4 of the sample rate, by the bilinear transform.
  'low-passed': (random) => {
    const g = Math.tan(Math.PI * 0.4);
    const sections = [1, 3, 5, 7].map((k) => {
      const damping = 2 * Math.cos((Math.PI * k) / 16);
      const scale = 1 / (1 + damping * g + g * g);
      return {
        gain: g * g * scale,
        a1: 2 * (g * g - 1) * scale,
        a2: (1 - damping * g + g * g) * scale,
        z1: 0,
        z2: 0,
      };
    });
    return () => {
      let value = random.gaussian();
      for (const s of sections) {
        const out = s.gain * value + s.z1;
        s.z1 = 2 * s.gain * value - s.a1 * out + s.z2;
        s.z2 = s.gain * value - s.a2 * out;
        value = out;
      }
      return value + 1e-4 * random.gaussian();
    };
  },
};
