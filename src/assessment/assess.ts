import type { Part } from '../config/parts.ts';
import type { Evidence } from '../manipulation/evidence.ts';
import type { MeasuredSpeed, SpectralPeak } from '../manipulation/measurement.ts';
import { type BearingFault, type Finding, findFaults, inseparable, type ObservedSpeed } from './evidence.ts';
import {
  findingWords,
  frequencyOfFault,
  notSeparableWords,
  partInSentence,
  sidebandOf,
  strongestDb,
} from './evidence-words.ts';
import { shaftsOf } from './fault-frequencies.ts';
import { harmonicName, LineNames } from './line-names.ts';
import type { SeenShaft } from './standing-lines.ts';

/** One spectrum of a measuring point: its plain one, or that of its envelope. */
export interface AssessedSpectrum {
  readonly kind: 'envelope' | 'plain';
  readonly peaks: readonly SpectralPeak[];
  readonly lineSpacingHz: number;
  /** Highest frequency at which a line could have stood out. */
  readonly toHz: number;
}

export interface Assessed {
  /** Of each spectrum, in the order in which they came: the peaks with their names. */
  readonly peaks: readonly (readonly SpectralPeak[])[];
  readonly evidence: readonly Evidence[];
}

/**
 * A named fault needs lines at most 1/25 of the shaft speed apart; segments are laid out by the nominal speed, from which
 * a shaft may differ by some percent.
 */
const widestSpacing = 1.05 / 25;
/** A part's own shaft may show many harmonics, any other shaft of the machine some. */
const harmonicsOfOtherShafts = 10;

/**
 * Names the lines of a point's spectra and tells what they say of the parts that it hears. Nothing is named by a speed
 * that is not known, or that the recording contradicts.
 */
export function assess(
  spectra: readonly AssessedSpectrum[],
  speed: MeasuredSpeed | null,
  heard: readonly Part[],
  partsOfMachine: readonly Part[],
): Assessed {
  const observed = observedSpeed(speed);
  const evidence: Evidence[] = [];
  const found = spectra.map((spectrum) =>
    observed === null ? [] : faultsIn(spectrum, observed, heard, partsOfMachine, spectra.length),
  );
  const peaks = spectra.map((spectrum, n) => {
    const findings = found[n].filter((finding) => !isToldBetter(finding, found.flat()));
    evidence.push(...findings.map((finding) => evidenceOf(finding, spectrum.kind, heard)));
    if (observed !== null) evidence.push(...notSeparable(spectrum, observed, heard, findings));
    return named(spectrum, findings, new LineNames(heard, observed, spectrum.lineSpacingHz), heard);
  });
  return { peaks, evidence };
}

/** The speed by which lines may be named: as the spectra show it, else as it was declared or measured. */
export function observedSpeed(speed: MeasuredSpeed | null): ObservedSpeed | null {
  if (speed === null || !speed.usableForNames) return null;
  const { rpm, uncertaintyRpm } = speed.inSpectrum ?? speed;
  return rpm > 0 ? { hz: rpm / 60, uncertaintyHz: uncertaintyRpm / 60 } : null;
}

function faultsIn(
  spectrum: AssessedSpectrum,
  speed: ObservedSpeed,
  heard: readonly Part[],
  partsOfMachine: readonly Part[],
  spectra: number,
): Finding[] {
  const { lineSpacingHz, peaks, toHz } = spectrum;
  const fine = heard.filter(({ shaft }) => lineSpacingHz <= widestSpacing * shaft * speed.hz);
  if (fine.length === 0) return [];
  const shafts = shaftsOf(partsOfMachine).map(
    (turns, n): SeenShaft => ({
      hz: turns * speed.hz,
      uncertaintyHz: turns * speed.uncertaintyHz,
      harmonics: n === 0 ? Number.POSITIVE_INFINITY : harmonicsOfOtherShafts,
    }),
  );
  const searched = { lines: peaks, lineSpacingHz, fromHz: 4 * lineSpacingHz, toHz };
  return findFaults(searched, fine, speed, shafts, spectra);
}

/** Whether another spectrum says more surely what the lines may be as well: two names for one fault help nobody. */
function isToldBetter({ orElse, chance }: Finding, all: readonly Finding[]): boolean {
  return all.some(
    (one) =>
      one.chance < chance && orElse.some((other) => other.partId === one.partId && other.fault === one.fault),
  );
}

function evidenceOf(finding: Finding, spectrum: AssessedSpectrum['kind'], parts: readonly Part[]): Evidence {
  const { partId, fault, grade, family, expectedHz, observedHz, chance } = finding;
  const harmonics = family.lines.filter(({ sideband }) => sideband === 0).length;
  const nameOf = (id: string) => partInSentence(parts.find((part) => part.id === id)?.name ?? id);
  return {
    partId,
    fault,
    frequency: frequencyOfFault[fault],
    spectrum,
    grade,
    expectedHz,
    observedHz,
    harmonics,
    sidebands: family.lines.length - harmonics,
    aboveFloorDb: strongestDb(finding),
    chance,
    words: findingWords(finding, { part: nameOf, spectrum }),
  };
}

/** Lines where a fault's fundamental would be told from a harmonic of the shaft by no means. */
function notSeparable(
  { kind, peaks, lineSpacingHz }: AssessedSpectrum,
  speed: ObservedSpeed,
  heard: readonly Part[],
  findings: readonly Finding[],
): Evidence[] {
  return inseparable(heard, speed, lineSpacingHz)
    .filter(({ suspect: { hz } }) =>
      peaks.some((peak) => Math.abs(peak.frequencyHz - hz) <= 2 * lineSpacingHz),
    )
    .filter(
      ({ suspect }) => !findings.some((one) => one.partId === suspect.part.id && one.fault === suspect.fault),
    )
    .map(({ suspect, harmonic, neededHz }) => ({
      partId: suspect.part.id,
      fault: suspect.fault,
      frequency: frequencyOfFault[suspect.fault],
      spectrum: kind,
      grade: 'not separable',
      expectedHz: suspect.hz,
      neededLineSpacingHz: neededHz ?? 0,
      words: notSeparableWords({
        frequency: frequencyOfFault[suspect.fault],
        part: partInSentence(suspect.part.name),
        expectedHz: suspect.hz,
        harmonic,
        shaftHz: speed.hz,
        spectrum: kind,
        neededHz,
      }),
    }));
}

/** 'BPFO x2'; an element that strikes both races makes the even multiples of its spin. */
function lineOfFault(fault: BearingFault, harmonic: number): string {
  return fault === 'rolling element'
    ? harmonicName('BSF', 2 * harmonic)
    : harmonicName(frequencyOfFault[fault], harmonic);
}

function named(
  { peaks }: AssessedSpectrum,
  findings: readonly Finding[],
  names: LineNames,
  parts: readonly Part[],
): SpectralPeak[] {
  const ofFamilies = new Map<unknown, string[]>();
  for (const finding of findings) {
    const own = new Set(finding.family.lines.map(({ line }) => line));
    // A line that might be another part's as well has both names.
    for (const { partId, fault, family } of [finding, ...finding.orElse]) {
      const part = parts.find(({ id }) => id === partId)?.name ?? partId;
      for (const { line, harmonic, sideband } of family.lines) {
        if (!own.has(line)) continue;
        const beside = sideband === 0 ? '' : ` ${sideband < 0 ? '-' : '+'} ${sidebandOf(fault)}`;
        const name = `${lineOfFault(fault, harmonic)}${beside}, ${part}`;
        ofFamilies.set(line, [...(ofFamilies.get(line) ?? []), name]);
      }
    }
  }
  return peaks.map((peak) => ({
    ...peak,
    names: ofFamilies.get(peak) ?? (peak.kind === 'tone' ? names.namesOf(peak.frequencyHz) : []),
  }));
}
