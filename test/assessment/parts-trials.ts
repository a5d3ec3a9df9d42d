import { assess } from '../../src/assessment/assess.ts';
import type { Evidence } from '../../src/manipulation/evidence.ts';
import type { MeasuredSpeed } from '../../src/manipulation/measurement.ts';
import { seededRandom } from '../signal/random.ts';
import { searched, spectrumOf, speedOf } from './evidence-trials.ts';
import { type MachineOf, type PartsMachine, partsMachine } from './parts-machine.ts';

/** What a recording of a simulated machine says of its parts, from its samples on. */
export function assessParts(machine: PartsMachine): readonly Evidence[] {
  const { samples, rateHz, segmentSamples, declaredHz, parts } = machine;
  const plain = searched(samples, rateHz, segmentSamples);
  const spectrum = spectrumOf('plain', plain, rateHz / 2);
  const declared = speedOf(plain, declaredHz, rateHz);
  const speed: MeasuredSpeed =
    machine.pulses === true
      ? { ...declared, origin: 'pulses', uncertaintyRpm: 60 * 0.0002 * declaredHz, inSpectrum: null }
      : declared;
  return assess([spectrum], speed, parts, parts).evidence;
}

/** What is found, the lines that every motor has left out: they are there, and it is said of all. */
export function partFaults(evidence: readonly Evidence[]): string[] {
  const found = evidence.filter(({ grade, fault }) => grade !== 'not separable' && !ordinary.includes(fault));
  return [...new Set(found.map(({ fault }) => fault))];
}

const ordinary = ['magnetic field', 'rotor bar pass'];

/** How many of so many machines with a fault are given it, and no other. */
export function faultsFound(kind: MachineOf, fault: string, machines: number, seed: number): number {
  let right = 0;
  for (let n = 0; n < machines; n++) {
    const found = partFaults(assessParts(partsMachine(seededRandom(seed + n), kind, fault)));
    if (found.length === 1 && found[0] === fault) right++;
  }
  return right;
}

/** Of so many sound machines: every third shows harmonics of 1x throughout, every third lines of strangers. */
export function soundNamed(kind: MachineOf, machines: number, seed: number): number {
  let named = 0;
  for (let n = 0; n < machines; n++) {
    // Harmonics throughout are what is told of a coupling, and no mistake.
    const beside = (['nothing', kind === 'coupling' ? 'strangers' : 'harmonics', 'strangers'] as const)[
      n % 3
    ];
    const machine = partsMachine(seededRandom(seed + n), kind, null, beside);
    if (partFaults(assessParts(machine)).length > 0) named++;
  }
  return named;
}
