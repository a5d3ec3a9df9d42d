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

/** Of so many machines with the fault: given it and no other, and given any. Without a fault: given any. */
export function partTrials(kind: MachineOf, fault: string | null, machines: number, seed: number) {
  let right = 0;
  let named = 0;
  for (let n = 0; n < machines; n++) {
    const found = partFaults(assessParts(partsMachine(seededRandom(seed + n), kind, fault)));
    if (found.length > 0) named++;
    if (found.length === 1 && found[0] === fault) right++;
  }
  return { right, named };
}
