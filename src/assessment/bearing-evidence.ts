import type { Part } from '../config/parts.ts';
import type { Evidence, FaultEvidence, NotSeparable } from '../manipulation/evidence.ts';
import type { Finding, Inseparable } from './evidence.ts';
import {
  alsoWords,
  findingWords,
  frequencyOfFault,
  notSeparableWords,
  partInSentence,
  strongestDb,
} from './evidence-words.ts';

type SpectrumKind = Evidence['spectrum'];

export interface FoundIn {
  readonly finding: Finding;
  readonly spectrum: SpectrumKind;
}

export interface InseparableIn {
  readonly inseparable: Inseparable;
  readonly spectrum: SpectrumKind;
}

/**
 * What a point's spectra say of its bearings, one sentence a fault: a fault found in both is told where it is least likely
 * by accident, with the other beside it, and one found in either is no longer one that cannot be told.
 */
export function bearingEvidence(
  found: readonly FoundIn[],
  untold: readonly InseparableIn[],
  parts: readonly Part[],
  shaftHz: number,
): Evidence[] {
  const about = ({ partId, fault }: Finding) => `${partId} ${fault}`;
  const told = new Map<string, FoundIn[]>();
  for (const one of found) told.set(about(one.finding), [...(told.get(about(one.finding)) ?? []), one]);
  const beside = new Map<string, InseparableIn[]>();
  for (const one of untold) {
    const { suspect } = one.inseparable;
    const key = `${suspect.part.id} ${suspect.fault}`;
    if (!told.has(key)) beside.set(key, [...(beside.get(key) ?? []), one]);
  }
  return [
    ...[...told.values()].map((alike) => foundEvidence(alike, parts)),
    ...[...beside.values()].map((alike) => inseparableEvidence(alike, shaftHz)),
  ];
}

function foundEvidence(alike: readonly FoundIn[], parts: readonly Part[]): FaultEvidence {
  const [first, also] = [...alike].sort((a, b) => a.finding.chance - b.finding.chance);
  const { finding, spectrum } = first;
  const { partId, fault, grade, family, expectedHz, observedHz, chance } = finding;
  const harmonics = family.lines.filter(({ sideband }) => sideband === 0).length;
  const part = (id: string) => partInSentence(parts.find((one) => one.id === id)?.name ?? id);
  const words = findingWords(finding, { part, spectrum });
  return {
    partId,
    fault,
    frequency: frequencyOfFault[fault],
    spectrum,
    grade,
    ...(also === undefined ? {} : { alsoIn: also.spectrum }),
    expectedHz,
    observedHz,
    harmonics,
    sidebands: family.lines.length - harmonics,
    aboveFloorDb: strongestDb(finding),
    chance,
    words: also === undefined ? words : `${words}; ${alsoWords(also.finding, also.spectrum)}`,
  };
}

function inseparableEvidence(alike: readonly InseparableIn[], shaftHz: number): NotSeparable {
  const [{ inseparable, spectrum }] = alike;
  const { suspect, harmonic, neededHz } = inseparable;
  const frequency = frequencyOfFault[suspect.fault];
  return {
    partId: suspect.part.id,
    fault: suspect.fault,
    frequency,
    spectrum,
    grade: 'not separable',
    expectedHz: suspect.hz,
    neededLineSpacingHz: neededHz ?? 0,
    words: notSeparableWords({
      ...{
        frequency,
        part: partInSentence(suspect.part.name),
        expectedHz: suspect.hz,
        harmonic,
        shaftHz,
        neededHz,
      },
      spectra: alike.map((one) => one.spectrum),
    }),
  };
}
