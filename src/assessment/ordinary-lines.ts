import type { Part } from '../config/parts.ts';
import type { ObservedSpeed } from './evidence.ts';
import { characteristicFrequencies, type FrequencyKind, frequencyHz } from './fault-frequencies.ts';
import type { SeenShaft } from './standing-lines.ts';

/** Line frequencies stay within 0.2 % of their rated value (EN 50160, 99.5 % of the year: 1 %; as a rule far nearer). */
export const gridUncertainty = 0.002;
/** Multiples of twice the line frequency that a sound motor may show. */
const harmonicsOfSupply = 6;
const harmonicsOfParts = 4;

/** Lines that sound machines show. */
const ordinary: readonly FrequencyKind[] = [
  'gear mesh',
  'vane pass',
  'blade pass',
  'rotor bar pass',
  'twice line',
  'planet pass',
  'coupling',
];

/** What electric motors pull at, as something that turns: lines there say nothing of what else is near. */
export function supplies(parts: readonly Part[]): SeenShaft[] {
  const fed = parts.flatMap((part) => (part.kind === 'electric-motor' ? [2 * part.lineHz] : []));
  return [...new Set(fed)].map((hz) => ({
    hz,
    uncertaintyHz: gridUncertainty * hz,
    harmonics: harmonicsOfSupply,
  }));
}

/** Where parts other than the one that is looked at make lines while they are sound, Hz ascending. */
export function ordinaryLines(parts: readonly Part[], except: Part, speed: ObservedSpeed): number[] {
  const found = parts
    .filter((part) => part !== except)
    .flatMap(characteristicFrequencies)
    .filter(({ kind }) => ordinary.includes(kind))
    .flatMap((one) =>
      Array.from({ length: harmonicsOfParts }, (_, n) => (n + 1) * frequencyHz(one, speed.hz)),
    );
  return found.sort((a, b) => a - b);
}
