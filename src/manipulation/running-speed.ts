import type { QualityFinding } from '../acquisition/recording.ts';
import type { NoTurnSpeed, TurnSpeed } from '../signal/pulse-speed.ts';
import { findSpeed, type SpeedFound, type SpeedSpectrum } from '../signal/spectrum-speed.ts';
import type { MeasuredSpeed, SpeedInSpectrum } from './measurement.ts';

/** Uncertainty of a speed that a logger wrote down: its tachometer, and drift over the recording. */
const sidecarUncertainty = 0.005;
/** Uncertainty of a nominal speed: induction motors slip by up to about 3 % between no and full load. */
const nominalUncertainty = 0.03;
/**
 * Where the harmonics of a speed are nowhere near the declared one, they are looked for this far from it, and contradict
 * it if there are so many: a shaft of another machine that is heard faintly shows fewer.
 */
const farWithin = 0.3;
const leastFarHarmonics = 5;
/** A speed that moves by more than this within a recording, from slowest to fastest, is a start, a stop or a change of load. */
const transientPart = 0.05;

export interface SpeedQuestion {
  /** As the logger wrote it down; 0: at a standstill. */
  readonly sidecarRpm: number | null;
  /** As the site file says it, Hz. */
  readonly nominalHz: number | null;
  /** Of the machine's pulse channel; null: it has none. */
  readonly pulses?: TurnSpeed | NoTurnSpeed | null;
  /** Of the machine's points; empty: a speed cannot be looked for. */
  readonly spectra?: readonly SpeedSpectrum[];
  /** How far from the declared speed it is looked for, in percent; null: never. */
  readonly findWithinPercent?: number | null;
}

export interface SpeedAnswer {
  readonly speed: MeasuredSpeed | null;
  readonly findings: readonly QualityFinding[];
}

/** A speed that somebody declared, Hz. */
interface Declared {
  readonly hz: number;
  readonly uncertaintyHz: number;
  readonly who: 'the sidecar' | 'the site file';
}

/** What the recording itself says beside the declared speed. */
interface Seen {
  readonly near: SpeedFound | null;
  readonly far: SpeedFound | null;
}

/**
 * A machine's running speed in one recording, by the best source there is: the sidecar, its pulses, the harmonics of the
 * shaft in the spectra of its points, the nominal speed. A declared speed that the recording contradicts is kept, for
 * nobody knows which of the two is right, but flagged, and lines are not named by it.
 */
export function runningSpeed(question: SpeedQuestion): SpeedAnswer {
  const { sidecarRpm, nominalHz, pulses = null } = question;
  const turning = pulses !== null && !('refused' in pulses) ? pulses : null;
  const findings: QualityFinding[] = [];
  if (pulses !== null && 'refused' in pulses)
    findings.push({ flag: 'speed-doubtful', detail: `no speed from the pulse channel: ${pulses.refused}` });
  if (turning !== null) findings.push(...movedFinding(turning));
  if (sidecarRpm !== null) return fromSidecar(sidecarRpm, turning, question, findings);
  if (turning !== null) {
    const speed = { ...plain(turning.meanHz, turning.uncertaintyHz), origin: 'pulses' } as const;
    return { speed: { ...speed, rangeRpm: rangeOf(turning) }, findings };
  }
  if (nominalHz === null) return { speed: null, findings };
  const { speed, ...told } = withoutMeasured(nominalHz, question, findings);
  // Where somebody counts pulses and they tell nothing, the shaft may stand still, or turn at any speed.
  const isGuess = pulses !== null && speed?.origin === 'nominal';
  return { ...told, speed: isGuess ? { ...speed, usableForNames: false } : speed };
}

function fromSidecar(
  sidecarRpm: number,
  turning: TurnSpeed | null,
  question: SpeedQuestion,
  findings: readonly QualityFinding[],
): SpeedAnswer {
  const hz = Math.abs(sidecarRpm) / 60;
  const declared: Declared = { hz, uncertaintyHz: sidecarUncertainty * hz, who: 'the sidecar' };
  const speed = {
    ...plain(hz, declared.uncertaintyHz),
    // As it was written, sign and all: the way through hertz would change the last digits.
    rpm: sidecarRpm,
    origin: 'sidecar',
    rangeRpm: turning && rangeOf(turning),
  } as const;
  if (turning !== null) {
    if (!differ(declared, turning.meanHz, turning.uncertaintyHz)) return { speed, findings };
    const shown = `its pulses show ${rpm(turning.meanHz)}`;
    return doubtful(speed, findings, declared, shown);
  }
  const seen = lookFor(hz, question);
  const inSpectrum = seen.near && asSeen(seen.near);
  const other = contradiction(declared, seen);
  const confirmed = { ...speed, inSpectrum };
  return other === null
    ? { speed: confirmed, findings }
    : doubtful(confirmed, findings, declared, `the spectrum shows the harmonics of ${rpm(other.speedHz)}`);
}

/** From the spectrum, else the nominal speed. */
function withoutMeasured(
  nominalHz: number,
  question: SpeedQuestion,
  findings: readonly QualityFinding[],
): SpeedAnswer {
  const { near, far } = lookFor(nominalHz, question);
  if (near !== null) {
    const speed = { ...plain(near.speedHz, near.uncertaintyHz), origin: 'spectrum' } as const;
    return { speed: { ...speed, inSpectrum: asSeen(near) }, findings };
  }
  const declared: Declared = {
    hz: nominalHz,
    uncertaintyHz: nominalUncertainty * nominalHz,
    who: 'the site file',
  };
  const speed = { ...plain(nominalHz, declared.uncertaintyHz), origin: 'nominal' } as const;
  return far === null
    ? { speed, findings }
    : doubtful(speed, findings, declared, `the spectrum shows the harmonics of ${rpm(far.speedHz)}`);
}

function lookFor(aroundHz: number, { spectra = [], findWithinPercent = null }: SpeedQuestion): Seen {
  if (findWithinPercent === null || spectra.length === 0 || !(aroundHz > 0)) return { near: null, far: null };
  const near = findSpeed(spectra, aroundHz, findWithinPercent / 100);
  if (!('refused' in near)) return { near, far: null };
  const far = findSpeed(spectra, aroundHz, Math.max(farWithin, findWithinPercent / 100));
  return { near: null, far: 'refused' in far || far.harmonics.length < leastFarHarmonics ? null : far };
}

function contradiction(declared: Declared, { near, far }: Seen): SpeedFound | null {
  if (near === null) return far;
  return differ(declared, near.speedHz, near.uncertaintyHz) ? near : null;
}

function differ(declared: Declared, hz: number, uncertaintyHz: number): boolean {
  return Math.abs(hz - declared.hz) > declared.uncertaintyHz + uncertaintyHz;
}

function doubtful(
  speed: MeasuredSpeed,
  findings: readonly QualityFinding[],
  { who, hz }: Declared,
  shown: string,
): SpeedAnswer {
  const detail = `${who} says ${rpm(hz)}, ${shown}; no line is named by it`;
  return {
    speed: { ...speed, usableForNames: false },
    findings: [...findings, { flag: 'speed-doubtful', detail }],
  };
}

function movedFinding({ meanHz, lowestHz, highestHz }: TurnSpeed): QualityFinding[] {
  if (highestHz - lowestHz <= transientPart * meanHz) return [];
  const detail = `the speed moved between ${rpm(lowestHz)} and ${rpm(highestHz)} within the recording`;
  return [{ flag: 'transient', detail }];
}

function plain(hz: number, uncertaintyHz: number) {
  // What the way through hertz adds in the last digits is taken off again: the site file says r/min.
  const rounded = Number((60 * hz).toPrecision(12));
  const unseen = { usableForNames: true, rangeRpm: null, inSpectrum: null };
  return { rpm: rounded, uncertaintyRpm: 60 * uncertaintyHz, ...unseen };
}

function asSeen({ speedHz, uncertaintyHz, score }: SpeedFound): SpeedInSpectrum {
  return { rpm: 60 * speedHz, uncertaintyRpm: 60 * uncertaintyHz, score };
}

function rangeOf({ lowestHz, highestHz }: TurnSpeed) {
  return { lowest: 60 * lowestHz, highest: 60 * highestHz };
}

function rpm(hz: number): string {
  return `${Number((60 * hz).toPrecision(4))} rpm`;
}
