import type { Part } from '../config/parts.ts';
import type { ObservedSpeed } from './evidence.ts';
import { type CharacteristicFrequency, characteristicFrequencies, frequencyHz } from './fault-frequencies.ts';
import { gridUncertainty } from './ordinary-lines.ts';
import { separationLines } from './standing-lines.ts';

/** A place where a line has a name: what excites it, and how well the place is known. */
interface NamedPlace {
  readonly name: string;
  readonly hz: number;
  readonly uncertaintyHz: number;
  /** In turns of the running speed, where it is locked to it; two names of one multiple are one line. */
  readonly perTurn: number | null;
}

const mostHarmonics = 4;
/** Harmonics of the running speed that are named, as long as the speed is known well enough. */
const mostOrders = 20;
/** Two places nearer than this part of a line are one: the vanes of a seven-vane wheel pass at 7x. */
const samePlace = 0.05;

/**
 * Names of lines that are locked to the running speed or to the electric supply. Given where the place is known to a
 * line and nothing else with a name lies within two lines; frequencies that slip are named by their family only.
 * `speed` null: the running speed is not known well enough for names.
 */
export class LineNames {
  readonly #places: readonly NamedPlace[];
  readonly #lineSpacingHz: number;

  constructor(parts: readonly Part[], speed: ObservedSpeed | null, lineSpacingHz: number) {
    this.#lineSpacingHz = lineSpacingHz;
    this.#places = placesOf(parts, speed).sort((a, b) => a.hz - b.hz);
  }

  /** Of a line; empty where it has none, or where several might be meant. */
  namesOf(lineHz: number): string[] {
    const near = this.#places.filter(
      ({ hz, uncertaintyHz }) =>
        Math.abs(hz - lineHz) <= separationLines * this.#lineSpacingHz + uncertaintyHz,
    );
    const meant = near.filter(({ hz }) => Math.abs(hz - lineHz) <= this.#lineSpacingHz);
    const [first] = meant;
    if (first === undefined) return [];
    const same = (one: NamedPlace) => Math.abs(one.hz - first.hz) <= samePlace * this.#lineSpacingHz;
    const known = near.every((one) => same(one) && one.uncertaintyHz <= this.#lineSpacingHz);
    return known ? [...new Set(meant.map(({ name }) => name))] : [];
  }
}

function placesOf(parts: readonly Part[], speed: ObservedSpeed | null): NamedPlace[] {
  const places: NamedPlace[] = [];
  for (let order = 1; speed !== null && order <= mostOrders; order++) {
    const uncertaintyHz = order * speed.uncertaintyHz;
    places.push({ name: `${order}x`, hz: order * speed.hz, uncertaintyHz, perTurn: order });
  }
  for (const part of parts) {
    for (const one of characteristicFrequencies(part)) {
      if (!one.slips && (speed !== null || one.perTurn === 0)) places.push(...harmonicsOf(part, one, speed));
    }
  }
  return places;
}

function harmonicsOf(part: Part, one: CharacteristicFrequency, speed: ObservedSpeed | null): NamedPlace[] {
  const places: NamedPlace[] = [];
  const base = frequencyHz(one, speed?.hz ?? 0);
  const uncertain =
    Math.abs(one.perTurn) * (speed?.uncertaintyHz ?? 0) + Math.abs(one.fixedHz) * gridUncertainty;
  const title = one.kind === 'shaft' ? `${one.of.replace(/^the /, '')} 1x` : one.kind;
  for (let harmonic = 1; harmonic <= mostHarmonics; harmonic++) {
    const times = one.kind === 'shaft' ? title.replace('1x', `${harmonic}x`) : harmonicName(title, harmonic);
    const hz = harmonic * base;
    const uncertaintyHz = harmonic * uncertain;
    const perTurn = one.fixedHz === 0 ? harmonic * one.perTurn : null;
    places.push({ name: `${times}, ${part.name}`, hz, uncertaintyHz, perTurn });
    for (const [beside, turns, fixedHz] of harmonic <= 2 ? sidebandsOf(part, one) : []) {
      for (const side of [-1, 1]) {
        places.push({
          name: `${times} ${side < 0 ? '-' : '+'} ${beside}, ${part.name}`,
          hz: hz + side * (turns * (speed?.hz ?? 0) + fixedHz),
          uncertaintyHz: uncertaintyHz + turns * (speed?.uncertaintyHz ?? 0) + fixedHz * gridUncertainty,
          perTurn: null,
        });
      }
    }
  }
  return places.filter(({ hz }) => hz > 0);
}

/** Distances of the usual sidebands: of a mesh the two shafts, of the rotor bars twice the line frequency. */
function sidebandsOf(part: Part, { kind }: CharacteristicFrequency): [string, number, number][] {
  if (kind === 'gear mesh' && part.kind === 'gear-pair') {
    return [
      ['1x', part.shaft, 0],
      ['mating shaft 1x', (part.teeth * part.shaft) / part.matingTeeth, 0],
    ];
  }
  if (kind === 'rotor bar pass' && part.kind === 'electric-motor')
    return [['twice line', 0, 2 * part.lineHz]];
  return [];
}

/** 'BPFO', 'BPFO x2'. */
export function harmonicName(name: string, harmonic: number): string {
  return harmonic === 1 ? name : `${name} x${harmonic}`;
}
