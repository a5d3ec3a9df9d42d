import type { Part, RollingBearing } from '../config/parts.ts';
import { type Comb, type Family, findFamily } from './families.ts';
import { bearingMultiples, slipAllowance } from './fault-frequencies.ts';
import { finerComb } from './finer-comb.ts';
import {
  FreeLines,
  isSeparable,
  nearestHarmonic,
  type SearchedSpectrum,
  type SeenShaft,
  separationLines,
} from './standing-lines.ts';

/** A fault that a rolling bearing can show, and the family of lines it would make. */
export type BearingFault = 'outer race' | 'inner race' | 'rolling element' | 'cage';

/** How much stands behind a finding; a finding is never a verdict. */
export type Grade = 'weak' | 'clear' | 'strong';

export interface Finding {
  readonly partId: string;
  readonly fault: BearingFault;
  readonly grade: Grade;
  /** Chance that lines like these stand out by accident, all families looked for in this recording taken together. */
  readonly chance: number;
  /** Fundamental of the family as observed, and by formula and observed speed, Hz. */
  readonly observedHz: number;
  readonly expectedHz: number;
  readonly family: Family;
  /** Other faults whose lines could lie in the same place; the nearest explanation is `fault`. */
  readonly orElse: readonly OtherFault[];
}

export interface OtherFault {
  readonly partId: string;
  readonly fault: BearingFault;
  readonly family: Family;
}

/** More than this chance of accident is no finding. */
export const mostChance = 0.001;
const clearChance = 1e-5;
const strongChance = 1e-8;
const strongDb = 10;

/** A fault of a part, and where its family would stand. */
export interface Suspect extends Comb {
  readonly part: RollingBearing;
  readonly fault: BearingFault;
}

/** The observed running speed, Hz, with the bounds within which it lies in about 95 of 100 recordings. */
export interface ObservedSpeed {
  readonly hz: number;
  readonly uncertaintyHz: number;
}

/**
 * Faults of rolling bearings for which families of lines stand out of a spectrum, least likely by accident first. Lines
 * that cannot be told from a shaft's harmonic count for nothing; a family that is the part of a finer comb is none; the
 * lines of a finding are taken away before the next is looked for. `spectra`: how many of this recording are searched.
 */
export function findFaults(
  spectrum: SearchedSpectrum,
  parts: readonly Part[],
  speed: ObservedSpeed,
  shafts: readonly SeenShaft[],
  spectra = 1,
): Finding[] {
  const suspects = parts.flatMap((part) => (part.kind === 'rolling-bearing' ? suspectsOf(part, speed) : []));
  const findings: Finding[] = [];
  let left = suspects;
  let lines = spectrum.lines;
  let free: FreeLines | null = null;
  while (left.length > 0) {
    const standing: FreeLines = new FreeLines({ ...spectrum, lines }, shafts, free);
    free = standing;
    const ranked = left
      .flatMap((suspect) => {
        const family = findFamily(standing, suspect);
        if (family === null) return [];
        return [{ suspect, family, chance: Math.min(1, family.chance * suspects.length * spectra) }];
      })
      .filter(({ chance }) => chance <= mostChance)
      .sort((a, b) => a.chance - b.chance);
    const best = likeliest(ranked);
    if (best === null) break;
    left = left.filter((one) => one !== best.suspect);
    const own = ownFrequencies(best.suspect.part, speed);
    if (finerComb(standing, best.family.hz, best.suspect.sidebandHz, own) !== null) continue;
    const taken = new Set(best.family.lines.map(({ line }) => line));
    lines = lines.filter((line) => !taken.has(line));
    findings.push({
      partId: best.suspect.part.id,
      fault: best.suspect.fault,
      grade: gradeOf(best.family, best.chance),
      chance: best.chance,
      observedHz: best.family.hz,
      expectedHz: best.suspect.hz,
      family: best.family,
      orElse: ranked
        .filter((one) => left.includes(one.suspect) && sharesMost(one.family, taken) && rivals(one, best))
        .map(({ suspect, family }) => ({ partId: suspect.part.id, fault: suspect.fault, family })),
    });
    left = left.filter((one) => !isExplained(one, best));
  }
  return findings;
}

interface Explained {
  readonly suspect: Suspect;
  readonly family: Family;
  readonly chance: number;
}

/** The one least likely by accident; of those that claim the same lines, the one whose picture they fit. */
function likeliest(ranked: readonly Explained[]): Explained | null {
  const [first, ...others] = ranked;
  if (first === undefined) return null;
  const lines = new Set(first.family.lines.map(({ line }) => line));
  return [first, ...others.filter(({ family }) => sharesMost(family, lines))].reduce((best, one) =>
    one.chance / likeness(one) < best.chance / likeness(best) ? one : best,
  );
}

/** Bearings lie beside the formulas by about this part of them; a defect that passes the load zone has sidebands. */
const usualSlip = 0.008;
const withoutSidebands = 0.1;

/** How well a family fits the picture of its fault, 1 at best. */
function likeness({ suspect, family }: Explained): number {
  const beside = (family.hz / suspect.hz - 1) / usualSlip;
  const bare = suspect.sidebandHz !== null && family.lines.every(({ sideband }) => sideband === 0);
  return Math.exp(-0.5 * beside * beside) * (bare ? withoutSidebands : 1);
}

/** A damaged element passes the load zone with its cage, which so makes lines at its own frequency. */
function isExplained({ part, fault }: Suspect, { suspect, family }: Explained): boolean {
  return (
    fault === 'cage' &&
    part === suspect.part &&
    suspect.fault === 'rolling element' &&
    family.lines.some(({ sideband }) => sideband !== 0)
  );
}

/** Within so much of each other two explanations of the same lines are not told apart. */
const toldApart = 100;

function rivals(one: Explained, best: Explained): boolean {
  return one.chance / likeness(one) < (toldApart * best.chance) / likeness(best);
}

function sharesMost(family: Family, taken: ReadonlySet<unknown>): boolean {
  const shared = family.lines.filter(({ line }) => taken.has(line)).length;
  return shared >= 2 && 2 * shared > family.lines.length;
}

/**
 * Where each fault would show: a defect of a fixed race as BPFO; of the turning race with sidebands at its shaft, since
 * it passes through the load zone once a turn; of an element twice a spin, passing through it with the cage (Randall &
 * Antoni 2011, figure 3).
 */
function suspectsOf(part: RollingBearing, speed: ObservedSpeed): Suspect[] {
  const { ftf, bsf, bpfo, bpfi } = bearingMultiples(part);
  const shaftHz = part.shaft * speed.hz;
  const window = slipAllowance + speed.uncertaintyHz / speed.hz;
  const suspect = (fault: BearingFault, multiple: number | null, sidebandTurns: number | null): Suspect[] =>
    multiple === null
      ? []
      : [
          {
            part,
            fault,
            window,
            hz: multiple * shaftHz,
            sidebandHz: sidebandTurns === null ? null : sidebandTurns * shaftHz,
          },
        ];
  const [outer, inner] = part.turningRing === 'inner' ? [null, 1] : [1, null];
  return [
    ...suspect('outer race', bpfo, outer),
    ...suspect('inner race', bpfi, inner),
    ...suspect('rolling element', bsf === null ? null : 2 * bsf, ftf),
    ...suspect('cage', ftf, null),
  ];
}

function ownFrequencies(part: RollingBearing, speed: ObservedSpeed): number[] {
  const { ftf, bsf } = bearingMultiples(part);
  return [ftf, bsf].flatMap((multiple) => (multiple === null ? [] : [multiple * part.shaft * speed.hz]));
}

function gradeOf({ lines }: Family, chance: number): Grade {
  const harmonics = lines.filter(({ sideband }) => sideband === 0);
  const highest = Math.max(...lines.map(({ line }) => line.aboveFloorDb));
  return gradeOfChance(chance, harmonics.length, highest);
}

/** By the chance of accident; strong evidence takes three lines as well, one of them 10 dB over the floor. */
export function gradeOfChance(chance: number, lines: number, highestDb: number): Grade {
  if (chance <= strongChance && lines >= 3 && highestDb >= strongDb) return 'strong';
  return chance <= clearChance ? 'clear' : 'weak';
}

export interface Inseparable {
  readonly suspect: Suspect;
  /** Of the running speed. */
  readonly harmonic: number;
  /** Line spacing at which the two are two lines, Hz; null: none, the formula gives the harmonic itself. */
  readonly neededHz: number | null;
}

/** Faults whose fundamental, by formula, cannot be told from a harmonic of the running speed at this line spacing. */
export function inseparable(
  parts: readonly Part[],
  speed: ObservedSpeed,
  lineSpacingHz: number,
): Inseparable[] {
  const shaft = { ...speed, harmonics: Number.POSITIVE_INFINITY };
  return parts
    .flatMap((part) => (part.kind === 'rolling-bearing' ? suspectsOf(part, speed) : []))
    .filter(({ hz }) => hz > 0.5 * speed.hz && !isSeparable(hz, shaft, lineSpacingHz))
    .map((suspect) => {
      const harmonic = nearestHarmonic(suspect.hz, shaft);
      const distance = Math.abs(suspect.hz - harmonic * speed.hz) - harmonic * speed.uncertaintyHz;
      const neededHz = distance / separationLines;
      return { suspect, harmonic, neededHz: neededHz > 0.002 * speed.hz ? neededHz : null };
    });
}
