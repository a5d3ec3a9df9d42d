import type { Part } from '../config/parts.ts';
import type { Evidence } from '../manipulation/evidence.ts';
import type { MeasuredSpeed, SpectralPeak } from '../manipulation/measurement.ts';
import { bearingEvidence, type FoundIn, type InseparableIn } from './bearing-evidence.ts';
import { type BearingFault, type Finding, findFaults, inseparable, type ObservedSpeed } from './evidence.ts';
import { frequencyOfFault, sidebandOf } from './evidence-words.ts';
import { shaftsOf } from './fault-frequencies.ts';
import { harmonicName, LineNames } from './line-names.ts';
import { supplies } from './ordinary-lines.ts';
import { type PartsShown, partsShown } from './part-evidence.ts';
import type { SearchedSpectrum, SeenShaft } from './standing-lines.ts';

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
  if (observed === null) {
    const names = (spectrum: AssessedSpectrum) => new LineNames(heard, null, spectrum.lineSpacingHz);
    return { peaks: spectra.map((one) => named(one, [], null, names(one), heard)), evidence: [] };
  }
  const inEach = spectra.map((one) => faultsIn(one, observed, heard, partsOfMachine, spectra.length));
  const found: FoundIn[] = [];
  const untold: InseparableIn[] = [];
  const ofParts: Evidence[] = [];
  const peaks = spectra.map((spectrum, n) => {
    const { kind, lineSpacingHz } = spectrum;
    const findings = inEach[n].filter((finding) => !isToldBetter(finding, inEach.flat()));
    found.push(...findings.map((finding) => ({ finding, spectrum: kind })));
    untold.push(
      ...notSeparable(spectrum, observed, heard).map((one) => ({ inseparable: one, spectrum: kind })),
    );
    const parts = kind === 'plain' ? partsIn(spectrum, observed, heard, partsOfMachine, inEach[n]) : null;
    ofParts.push(...(parts?.evidence ?? []));
    return named(spectrum, findings, parts, new LineNames(heard, observed, lineSpacingHz), heard);
  });
  return { peaks, evidence: [...bearingEvidence(found, untold, heard, observed.hz), ...ofParts] };
}

/** A speed that moves by more within a recording, from slowest to fastest, leaves no line at its place. */
const mostMoved = 0.05;

/**
 * The speed by which lines may be named: as the spectra show it, else as it was declared or measured. Where it moved,
 * a line may lie anywhere between its slowest and its fastest place.
 */
export function observedSpeed(speed: MeasuredSpeed | null): ObservedSpeed | null {
  if (speed === null || !speed.usableForNames) return null;
  const { rpm, uncertaintyRpm } = speed.inSpectrum ?? speed;
  const moved = speed.rangeRpm === null ? 0 : speed.rangeRpm.highest - speed.rangeRpm.lowest;
  if (!(rpm > 0) || moved > mostMoved * rpm) return null;
  return { hz: rpm / 60, uncertaintyHz: Math.max(uncertaintyRpm, moved / 2) / 60 };
}

function faultsIn(
  spectrum: AssessedSpectrum,
  speed: ObservedSpeed,
  heard: readonly Part[],
  partsOfMachine: readonly Part[],
  spectra: number,
): Finding[] {
  const parts = heard.filter((part) => isFine(spectrum, part, speed));
  if (parts.length === 0) return [];
  const shafts = shaftsOf(partsOfMachine).map(
    (turns, n): SeenShaft => ({
      hz: turns * speed.hz,
      uncertaintyHz: turns * speed.uncertaintyHz,
      harmonics: n === 0 ? Number.POSITIVE_INFINITY : harmonicsOfOtherShafts,
    }),
  );
  return findFaults(searched(spectrum), parts, speed, [...shafts, ...supplies(partsOfMachine)], spectra);
}

/** Whether another spectrum says more surely what the lines may be as well: two names for one fault help nobody. */
function isToldBetter({ orElse, chance }: Finding, all: readonly Finding[]): boolean {
  return all.some(
    (one) =>
      one.chance < chance && orElse.some((other) => other.partId === one.partId && other.fault === one.fault),
  );
}

/** What the plain spectrum says of the other parts; lines that a bearing makes are none of theirs. */
function partsIn(
  spectrum: AssessedSpectrum,
  speed: ObservedSpeed,
  heard: readonly Part[],
  partsOfMachine: readonly Part[],
  findings: readonly Finding[],
): PartsShown {
  const taken = new Set<unknown>(findings.flatMap(({ family }) => family.lines.map(({ line }) => line)));
  const all = searched(spectrum);
  const free = { ...all, lines: all.lines.filter((line) => !taken.has(line)) };
  return partsShown(free, speed, heard, (part) => isFine(spectrum, part, speed), partsOfMachine);
}

function isFine({ lineSpacingHz }: AssessedSpectrum, { shaft }: Part, speed: ObservedSpeed): boolean {
  return lineSpacingHz <= widestSpacing * shaft * speed.hz;
}

function searched({ lineSpacingHz, peaks, toHz }: AssessedSpectrum): SearchedSpectrum {
  return { lines: peaks, lineSpacingHz, fromHz: 4 * lineSpacingHz, toHz };
}

/** Lines where a fault's fundamental would be told from a harmonic of the shaft by no means. */
function notSeparable(
  { peaks, lineSpacingHz }: AssessedSpectrum,
  speed: ObservedSpeed,
  heard: readonly Part[],
) {
  return inseparable(heard, speed, lineSpacingHz).filter(({ suspect: { hz } }) =>
    peaks.some((peak) => Math.abs(peak.frequencyHz - hz) <= 2 * lineSpacingHz),
  );
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
  others: PartsShown | null,
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
  const namesOf = (peak: SpectralPeak): readonly string[] => {
    const ofFamily = ofFamilies.get(peak);
    if (ofFamily !== undefined) return ofFamily;
    const known = peak.kind === 'tone' ? names.namesOf(peak.frequencyHz) : [];
    return [...new Set([...known, ...(others?.names.get(peak) ?? [])])];
  };
  return peaks.map((peak) => ({ ...peak, names: namesOf(peak) }));
}
