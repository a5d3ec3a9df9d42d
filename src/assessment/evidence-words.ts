import { printFrequency, printNumber } from '../config/print-value.ts';
import type { BearingFault, Finding } from './evidence.ts';

/** Frequencies by their names in the trade, with what stands at a fault's fundamental. */
export const frequencyOfFault: Readonly<Record<BearingFault, string>> = {
  'outer race': 'BPFO',
  'inner race': 'BPFI',
  'rolling element': 'twice BSF',
  cage: 'FTF',
};

const counts = ['no', 'one', 'two', 'three', 'four', 'five', 'six', 'seven', 'eight'];

/** 'three harmonics of BPFO of the drive-end bearing in the envelope (89.1 Hz), 14 dB over the floor, sidebands at 1x'. */
export function findingWords(
  finding: Finding,
  names: { readonly part: (id: string) => string; readonly spectrum: 'envelope' | 'plain' },
): string {
  const { fault, partId, family, observedHz, orElse } = finding;
  const harmonics = family.lines.filter(({ sideband }) => sideband === 0).length;
  const lines = linesWord(harmonics);
  const where = inSpectrum(names.spectrum);
  const highest = printNumber(strongestDb(finding), 2);
  const sidebands = family.lines.length > harmonics ? `, sidebands at ${sidebandOf(fault)}` : '';
  const other = orElse.map(
    (one) => `; ${frequencyOfFault[one.fault]} of ${names.part(one.partId)} would lie there as well`,
  );
  return (
    `${lines} of ${frequencyOfFault[fault]} of ${names.part(partId)} ${where} ` +
    `(${printFrequency(observedHz)}), ${highest} dB over the floor${sidebands}${other.join('')}`
  );
}

/** Of the same fault in the point's other spectrum: 'two harmonics in the spectrum as well, 9 dB over the floor'. */
export function alsoWords(finding: Finding, spectrum: 'envelope' | 'plain'): string {
  const harmonics = finding.family.lines.filter(({ sideband }) => sideband === 0).length;
  return `${linesWord(harmonics)} ${inSpectrum(spectrum)} as well, ${printNumber(strongestDb(finding), 2)} dB over the floor`;
}

function linesWord(harmonics: number): string {
  return harmonics === 1 ? 'one line' : `${counts[harmonics] ?? harmonics} harmonics`;
}

function inSpectrum(spectrum: 'envelope' | 'plain'): string {
  return spectrum === 'envelope' ? 'in the envelope' : 'in the spectrum';
}

export function strongestDb({ family }: Finding): number {
  return Math.max(...family.lines.map(({ line }) => line.aboveFloorDb));
}

/** What carries a defect through the load zone, and so stands beside its lines. */
export function sidebandOf(fault: BearingFault): string {
  return fault === 'rolling element' ? 'FTF' : '1x';
}

/** A name from the site file within a sentence: words of common speech take their article, names of their own do not. */
export function partInSentence(name: string): string {
  return /^\p{Ll}.*\s/u.test(name) ? `the ${name}` : name;
}

export function notSeparableWords(about: {
  readonly frequency: string;
  readonly part: string;
  readonly expectedHz: number;
  readonly harmonic: number;
  readonly shaftHz: number;
  readonly spectra: readonly ('envelope' | 'plain')[];
  readonly neededHz: number | null;
}): string {
  const { frequency, part, expectedHz, harmonic, shaftHz, neededHz } = about;
  const where = about.spectra.map(inSpectrum).join(' and ');
  const remedy =
    neededHz === null
      ? 'no line spacing would'
      : `lines ${printFrequency(neededHz, 2)} apart or closer would`;
  return (
    `${frequency} of ${part} (${printFrequency(expectedHz)}) cannot be told from ${harmonic}x ` +
    `(${printFrequency(harmonic * shaftHz)}) ${where}; ${remedy}`
  );
}
