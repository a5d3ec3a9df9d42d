import type {
  BearingMultiples,
  Belt,
  ElectricMotor,
  GearPair,
  Part,
  RollingBearing,
} from '../config/parts.ts';
import { planetaryFrequencies } from './planetary-frequencies.ts';

/** What a frequency is of; the abbreviations are those of ISO 13373 and of the trade. */
export type FrequencyKind =
  | 'FTF'
  | 'BSF'
  | 'BPFO'
  | 'BPFI'
  | 'gear mesh'
  | 'hunting tooth'
  | 'shaft'
  | 'planet pass'
  | 'sun defect'
  | 'planet defect'
  | 'vane pass'
  | 'blade pass'
  | 'belt'
  | 'twice line'
  | 'slip'
  | 'pole pass'
  | 'rotor bar pass'
  | 'coupling';

/**
 * A frequency that a part may excite: |perTurn x running speed + fixedHz|. Speeds in Hz; `perTurn` counts turns of
 * the machine's running speed, whatever shaft the part sits on.
 */
export interface CharacteristicFrequency {
  readonly kind: FrequencyKind;
  /** What excites it, for people: 'cage', 'outer race', 'the other shaft'. */
  readonly of: string;
  readonly perTurn: number;
  readonly fixedHz: number;
  /** Rolling elements slip and angles of contact move with the load: the true frequency may lie beside the formula. */
  readonly slips: boolean;
}

/**
 * Part by which a rolling bearing's frequencies may lie beside the formulas: 1 to 2 % (Randall & Antoni, Mech. Syst.
 * Signal Process. 25(2), 2011, 485-520, section 2).
 */
export const slipAllowance = 0.02;

export function frequencyHz({ perTurn, fixedHz }: CharacteristicFrequency, runningHz: number): number {
  return Math.abs(perTurn * runningHz + fixedHz);
}

/** All frequencies of a part, sources beside the formulas. A turn of the running speed is `part.shaft` turns of its own. */
export function characteristicFrequencies(part: Part): readonly CharacteristicFrequency[] {
  switch (part.kind) {
    case 'rolling-bearing':
      return bearingFrequencies(part);
    case 'gear-pair':
      return gearFrequencies(part);
    case 'planetary-gear':
      return planetaryFrequencies(part);
    case 'vanes':
      return [locked('vane pass', 'the vanes', part.count * part.shaft)];
    case 'blades':
      return [locked('blade pass', 'the blades', part.count * part.shaft)];
    case 'belt':
      return beltFrequencies(part);
    case 'electric-motor':
      return motorFrequencies(part);
    case 'coupling':
      return part.elements === null
        ? []
        : [locked('coupling', 'the elements of the coupling', part.elements * part.shaft)];
  }
}

/** A frequency that is a fixed multiple of the running speed. */
export function locked(kind: FrequencyKind, of: string, perTurn: number): CharacteristicFrequency {
  return { kind, of, perTurn, fixedHz: 0, slips: false };
}

/**
 * Kinematic multiples of a rolling bearing without slip, in turns of its shaft (Harris, Rolling Bearing Analysis;
 * Randall & Antoni 2011, equations 1 to 4), q = (d / D) cos(angle of contact), n elements:
 * FTF = (1 - q)/2, BPFO = n (1 - q)/2, BPFI = n (1 + q)/2, BSF = D (1 - q²)/(2 d). With the outer ring turning and the
 * inner fixed FTF = (1 + q)/2, the others stay. BSF is the spin of an element; a defect of one strikes both races,
 * twice a spin.
 */
export function bearingMultiples({
  geometry,
  multiples,
  turningRing,
}: Pick<RollingBearing, 'geometry' | 'multiples' | 'turningRing'>): BearingMultiples {
  if (geometry === null) return multiples;
  const { rollingElements: n, elementDiameter, pitchDiameter, contactAngleDeg } = geometry;
  const ratio = elementDiameter / pitchDiameter;
  const q = ratio * Math.cos((contactAngleDeg * Math.PI) / 180);
  return {
    ftf: multiples.ftf ?? (turningRing === 'inner' ? 1 - q : 1 + q) / 2,
    bsf: multiples.bsf ?? (1 - q * q) / (2 * ratio),
    bpfo: multiples.bpfo ?? (n * (1 - q)) / 2,
    bpfi: multiples.bpfi ?? (n * (1 + q)) / 2,
  };
}

function bearingFrequencies(bearing: RollingBearing): CharacteristicFrequency[] {
  const { ftf, bsf, bpfo, bpfi } = bearingMultiples(bearing);
  const known: [FrequencyKind, string, number | null][] = [
    ['FTF', 'cage', ftf],
    ['BSF', 'a rolling element', bsf],
    ['BPFO', 'outer race', bpfo],
    ['BPFI', 'inner race', bpfi],
  ];
  return known.flatMap(([kind, of, multiple]) =>
    multiple === null ? [] : [{ kind, of, perTurn: multiple * bearing.shaft, fixedHz: 0, slips: true }],
  );
}

/** Mesh z1 f1 = z2 f2; the same two teeth meet at mesh x gcd(z1, z2) / (z1 z2). */
function gearFrequencies({ teeth, matingTeeth, shaft }: GearPair): CharacteristicFrequency[] {
  const mesh = teeth * shaft;
  const hunting = (mesh * greatestCommonDivisor(teeth, matingTeeth)) / (teeth * matingTeeth);
  return [
    locked('gear mesh', 'the mesh', mesh),
    locked('shaft', 'the mating shaft', mesh / matingTeeth),
    locked('hunting tooth', 'the same two teeth', hunting),
  ];
}

/** A belt comes round at pi D f / L. */
function beltFrequencies({
  pulleyDiameter,
  length,
  otherPulleyDiameter,
  shaft,
}: Belt): CharacteristicFrequency[] {
  return [
    ...(length === null ? [] : [locked('belt', 'the belt', (Math.PI * pulleyDiameter * shaft) / length)]),
    ...(otherPulleyDiameter === null
      ? []
      : [locked('shaft', 'the driven shaft', (pulleyDiameter * shaft) / otherPulleyDiameter)]),
  ];
}

/**
 * Field 2 fL / p turns a second, p poles (IEC 60034); slip = field - shaft, pole pass = p x slip; the field pulls twice
 * a period of the line; bars pass the field's slots at bars x shaft, with sidebands at twice line. Belts, couplings and
 * motors as practice has them (for example ISO 13373-3, tables of fault symptoms).
 */
function motorFrequencies({ lineHz, poles, rotorBars, shaft }: ElectricMotor): CharacteristicFrequency[] {
  return [
    { kind: 'twice line', of: 'the magnetic field', perTurn: 0, fixedHz: 2 * lineHz, slips: false },
    {
      kind: 'slip',
      of: 'the rotor behind the field',
      perTurn: -shaft,
      fixedHz: (2 * lineHz) / poles,
      slips: false,
    },
    {
      kind: 'pole pass',
      of: 'the rotor behind the poles',
      perTurn: -poles * shaft,
      fixedHz: 2 * lineHz,
      slips: false,
    },
    ...(rotorBars === null ? [] : [locked('rotor bar pass', 'the rotor bars', rotorBars * shaft)]),
  ];
}

function greatestCommonDivisor(a: number, b: number): number {
  return b === 0 ? a : greatestCommonDivisor(b, a % b);
}

/** Turns of every shaft of a machine for one turn of its running speed; the running speed itself first. */
export function shaftsOf(parts: readonly Part[]): number[] {
  const turns = parts.flatMap((part) => [
    part.shaft,
    ...characteristicFrequencies(part).flatMap(({ kind, perTurn }) => (kind === 'shaft' ? [perTurn] : [])),
  ]);
  return [...new Set([1, ...turns])];
}
