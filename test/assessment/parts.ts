import {
  characteristicFrequencies,
  type FrequencyKind,
  frequencyHz,
} from '../../src/assessment/fault-frequencies.ts';
import type {
  BearingGeometry,
  Belt,
  ElectricMotor,
  GearPair,
  Part,
  PlanetaryGear,
  RollingBearing,
} from '../../src/config/parts.ts';

const place = { id: 'part', name: 'part', at: ['de-h'], shaft: 1 };

export function bearing(
  [rollingElements, elementDiameter, pitchDiameter, contactAngleDeg = 0]: readonly number[],
  more: Partial<RollingBearing> = {},
): RollingBearing {
  const geometry: BearingGeometry = {
    rollingElements: rollingElements ?? 0,
    elementDiameter: elementDiameter ?? 0,
    pitchDiameter: pitchDiameter ?? 0,
    contactAngleDeg,
  };
  const multiples = { ftf: null, bsf: null, bpfo: null, bpfi: null };
  return { ...place, kind: 'rolling-bearing', geometry, multiples, turningRing: 'inner', ...more };
}

export const gearPair = (teeth: number, matingTeeth: number, shaft = 1): GearPair => ({
  ...place,
  kind: 'gear-pair',
  shaft,
  teeth,
  matingTeeth,
});

export const planetary = (more: Partial<PlanetaryGear>): PlanetaryGear => ({
  ...place,
  kind: 'planetary-gear',
  sunTeeth: 28,
  planetTeeth: 26,
  ringTeeth: 80,
  planets: 3,
  held: 'ring',
  onShaft: 'sun',
  ...more,
});

export const belt = (more: Partial<Belt>): Belt => ({
  ...place,
  kind: 'belt',
  pulleyDiameter: 0.2,
  length: 2,
  otherPulleyDiameter: null,
  ...more,
});

export const motor = (lineHz: number, poles: number, rotorBars: number | null = null): ElectricMotor => ({
  ...place,
  kind: 'electric-motor',
  lineHz,
  poles,
  rotorBars,
});

export const wheel = (kind: 'vanes' | 'blades', count: number): Part => ({ ...place, kind, count });

/** A frequency of a part at a running speed, Hz; the first of its kind. */
export function hzOf(part: Part, kind: FrequencyKind, runningHz: number): number {
  const found = characteristicFrequencies(part).find((one) => one.kind === kind);
  if (found === undefined) throw new Error(`${part.kind} has no ${kind}`);
  return frequencyHz(found, runningHz);
}
