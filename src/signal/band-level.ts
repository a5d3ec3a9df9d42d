import { type Integrations, integrationFactor } from './integration.ts';

/** What a spectrum's lines are: their distance, and how many there are (0 Hz and half the sample rate included). */
export interface LineGrid {
  readonly lineSpacingHz: number;
  readonly lines: number;
}

/**
 * How a band adds up: mean square of the band = sum over i of weights[i] * density[firstLine + i].
 * The weights hold the part of each line's cell inside the band, in Hz, times the mean integration factor over it.
 */
export interface BandWeights {
  readonly firstLine: number;
  readonly weights: Float64Array;
}

export interface BandRefusal {
  readonly refused: 'empty' | 'beyond-half-rate';
  /** What is wrong and what would do, for people. */
  readonly reason: string;
}

/**
 * Weights of the band from `fromHz` to `toHz`, after 0, 1 or 2 integrations.
 *
 * Line k is the cell [(k - 1/2), (k + 1/2)] line spacings and counts for its part [a, b] inside the band. Line 0
 * never takes part: what the mean's removal leaves there is no vibration. So a band from 0 Hz begins at half a line.
 *
 * A band that holds no part of any line, or reaches beyond half the sample rate, is refused.
 * Checked: spacing 1 Hz, 10 to 12 Hz, no integration: lines 10, 11, 12 with weights 0.5, 1, 0.5.
 */
export function bandWeights(
  fromHz: number,
  toHz: number,
  grid: LineGrid,
  integrations: Integrations = 0,
): BandWeights | BandRefusal {
  const { lineSpacingHz: spacing, lines } = grid;
  const highestHz = spacing * (lines - 1);
  if (!(toHz <= highestHz * (1 + 1e-12))) {
    return {
      refused: 'beyond-half-rate',
      reason: `band ends at ${toHz} Hz, the spectrum at ${highestHz} Hz; end the band there or record faster`,
    };
  }
  const lowest = Math.max(fromHz, 0.5 * spacing);
  if (!(lowest < toHz)) {
    return {
      refused: 'empty',
      reason: `band from ${fromHz} to ${toHz} Hz holds no line (spacing ${spacing} Hz); widen it or use longer segments`,
    };
  }
  const firstLine = Math.max(1, Math.floor(lowest / spacing + 0.5));
  const lastLine = Math.min(lines - 1, Math.ceil(toHz / spacing - 0.5));
  const weights = new Float64Array(Math.max(1, lastLine - firstLine + 1));
  for (let i = 0; i < weights.length; i++) {
    const line = firstLine + i;
    const a = Math.max(lowest, (line - 0.5) * spacing);
    const b = Math.min(toHz, (line + 0.5) * spacing);
    // Rounding may leave an outermost line with nothing.
    if (b > a) weights[i] = (b - a) * integrationFactor(a, b, integrations);
  }
  return { firstLine, weights };
}

/** Mean square of the band, (unit of the band's quantity)², from a one-sided density per Hz. */
export function bandPower(density: Float64Array, { firstLine, weights }: BandWeights): number {
  // Two sums side by side: one addition need not wait for the one before.
  let even = 0;
  let odd = 0;
  let i = 0;
  for (; i + 1 < weights.length; i += 2) {
    even += weights[i] * density[firstLine + i];
    odd += weights[i + 1] * density[firstLine + i + 1];
  }
  if (i < weights.length) even += weights[i] * density[firstLine + i];
  return even + odd;
}

/** r.m.s. of the band: square root of `bandPower`. */
export function bandLevel(density: Float64Array, band: BandWeights): number {
  return Math.sqrt(bandPower(density, band));
}
