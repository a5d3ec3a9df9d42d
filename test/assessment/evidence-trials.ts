import { type Assessed, type AssessedSpectrum, assess } from '../../src/assessment/assess.ts';
import { bearingMultiples } from '../../src/assessment/fault-frequencies.ts';
import type { MeasuredSpeed, SpectralPeak } from '../../src/manipulation/measurement.ts';
import { averageDensity } from '../../src/signal/averaging.ts';
import { envelopeOf } from '../../src/signal/demodulation.ts';
import { envelopeAveraging } from '../../src/signal/envelope.ts';
import { findPeaks, type PeakSearch } from '../../src/signal/peaks.ts';
import { findSpeed } from '../../src/signal/spectrum-speed.ts';
import { seededRandom } from '../signal/random.ts';
import {
  type BearingMachine,
  bearingMachine,
  type MachineKind,
  type SimulatedFault,
  sampleRateHz,
} from './bearing-machine.ts';

/** The usual fixed band; envelope lines are looked for as far as they are right. */
const band = { fromHz: 2000, toHz: 8000, highestHz: 3000 };
const overlapPercent = 50;

export interface Searched {
  readonly search: PeakSearch;
  readonly averages: number;
  readonly lineSpacingHz: number;
  readonly segmentSamples: number;
}

export function searched(samples: Float64Array, rateHz: number, segmentSamples: number): Searched {
  const averaging = { window: 'hann', segmentSamples, overlapPercent, sampleRateHz: rateHz } as const;
  const { density, hopSamples, averages, lineSpacingHz } = averageDensity(samples, averaging);
  const search = findPeaks(density, { ...averaging, hopSamples, averages });
  return { search, averages, lineSpacingHz, segmentSamples };
}

export function spectrumOf(
  kind: AssessedSpectrum['kind'],
  { search, lineSpacingHz }: Searched,
  toHz: number,
): AssessedSpectrum {
  const peaks = search.peaks.map((peak): SpectralPeak => ({ ...peak, order: null, names: [] }));
  return { kind, peaks, lineSpacingHz, toHz };
}

/** What a recording of a simulated machine says, from its samples on: spectrum, speed, envelope, evidence. */
export function assessMachine(machine: BearingMachine): Assessed {
  const { samples, declaredHz, bearing } = machine;
  const widestHz = declaredHz / 25;
  const plainSegment = 2 ** Math.ceil(Math.log2(sampleRateHz / Math.min(1.6, widestHz)));
  const plain = searched(samples, sampleRateHz, plainSegment);
  const settings = {
    ...band,
    sampleRateHz,
    window: 'hann',
    overlapPercent,
    lineSpacingHz: widestHz,
  } as const;
  const { averaging } = envelopeAveraging(settings);
  const envelope = searched(
    envelopeOf(samples, { ...band, sampleRateHz }),
    averaging.sampleRateHz,
    averaging.segmentSamples,
  );
  return assess(
    [spectrumOf('plain', plain, sampleRateHz / 2), spectrumOf('envelope', envelope, band.highestHz)],
    speedOf(plain, declaredHz),
    [bearing],
    [bearing],
  );
}

/** As it was declared, and as the spectrum shows it where it does. */
export function speedOf(
  { search, averages, segmentSamples }: Searched,
  declaredHz: number,
  rateHz = sampleRateHz,
): MeasuredSpeed {
  const found = findSpeed(
    [{ search, averages, settings: { sampleRateHz: rateHz, segmentSamples } }],
    declaredHz,
    0.02,
  );
  return {
    rpm: 60 * declaredHz,
    origin: 'sidecar',
    uncertaintyRpm: 60 * 0.005 * declaredHz,
    usableForNames: true,
    rangeRpm: null,
    inSpectrum:
      'refused' in found
        ? null
        : { rpm: 60 * found.speedHz, uncertaintyRpm: 60 * found.uncertaintyHz, score: found.score },
  };
}

export const simulatedFaults = [
  'outer race',
  'inner race',
  'rolling element',
] as const satisfies readonly SimulatedFault[];

/** Faults that a recording is said to show, a fault in both spectra once. */
export function faultsNamed({ evidence }: Assessed): string[] {
  return [...new Set(evidence.filter(({ grade }) => grade !== 'not separable').map(({ fault }) => fault))];
}

/** How many of so many machines are given the one fault that they have, and no other. */
export function rightlyNamed(kind: MachineKind, machines: number, seed: number): number {
  let right = 0;
  for (let n = 0; n < machines; n++) {
    const named = faultsNamed(assessMachine(bearingMachine(seededRandom(seed + n), kind)));
    if (named.length === 1 && named[0] === kind.fault) right++;
  }
  return right;
}

/** How many of so many machines are given some fault. `kindOf` makes the nth of them. */
export function named(kindOf: (n: number) => MachineKind, machines: number, seed: number): number {
  let count = 0;
  for (let n = 0; n < machines; n++) {
    if (faultsNamed(assessMachine(bearingMachine(seededRandom(seed + n), kindOf(n)))).length > 0) count++;
  }
  return count;
}

/** What a window of 2 % around each frequency by declared speed would name: any line in it. */
export function namedByDeclaredSpeed(machine: BearingMachine): boolean {
  const { ftf: _cage, bsf, ...races } = bearingMultiples(machine.bearing);
  const [, envelope = []] = assessMachine(machine).peaks;
  return [...Object.values(races), 2 * (bsf ?? 0)].some((multiple) => {
    const hz = (multiple ?? 0) * machine.declaredHz;
    return envelope.some(({ frequencyHz }) => Math.abs(frequencyHz / hz - 1) < 0.02);
  });
}
