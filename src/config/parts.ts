/**
 * The parts of a machine that excite frequencies of their own, as the site file lists them. Lengths are metres,
 * angles degrees, frequencies Hz. `shaft`: turns of the part's shaft for one turn of the machine's running speed.
 */
export type Part =
  | RollingBearing
  | GearPair
  | PlanetaryGear
  | VanesOrBlades
  | Belt
  | ElectricMotor
  | Coupling;

export type PartKind = Part['kind'];

export interface PartPlace {
  readonly id: string;
  /** For people; as written, else its kind and id. */
  readonly name: string;
  /** Ids of the points that hear it. */
  readonly at: readonly string[];
  readonly shaft: number;
}

export interface RollingBearing extends PartPlace {
  readonly kind: 'rolling-bearing';
  /** Null where its multiples are given instead. */
  readonly geometry: BearingGeometry | null;
  /** Orders of the shaft as the maker of the bearing gives them; they stand in place of what the geometry would say. */
  readonly multiples: BearingMultiples;
  readonly turningRing: 'inner' | 'outer';
}

export interface BearingGeometry {
  readonly rollingElements: number;
  readonly elementDiameter: number;
  readonly pitchDiameter: number;
  readonly contactAngleDeg: number;
}

export interface BearingMultiples {
  readonly ftf: number | null;
  readonly bsf: number | null;
  readonly bpfo: number | null;
  readonly bpfi: number | null;
}

export interface GearPair extends PartPlace {
  readonly kind: 'gear-pair';
  /** Of the gear on `shaft`, and of the one it meshes with. */
  readonly teeth: number;
  readonly matingTeeth: number;
}

export type PlanetaryMember = 'sun' | 'ring' | 'carrier';

export interface PlanetaryGear extends PartPlace {
  readonly kind: 'planetary-gear';
  readonly sunTeeth: number;
  readonly planetTeeth: number;
  readonly ringTeeth: number;
  readonly planets: number;
  readonly held: PlanetaryMember;
  /** The member that turns with `shaft`. */
  readonly onShaft: PlanetaryMember;
}

export interface VanesOrBlades extends PartPlace {
  readonly kind: 'vanes' | 'blades';
  readonly count: number;
}

export interface Belt extends PartPlace {
  readonly kind: 'belt';
  /** Pitch diameter of the pulley on `shaft`. */
  readonly pulleyDiameter: number;
  /** As given, or from both pulleys and their distance; null where only the pulleys are known. */
  readonly length: number | null;
  readonly otherPulleyDiameter: number | null;
}

export interface ElectricMotor extends PartPlace {
  readonly kind: 'electric-motor';
  readonly lineHz: number;
  readonly poles: number;
  readonly rotorBars: number | null;
}

export interface Coupling extends PartPlace {
  readonly kind: 'coupling';
  /** Jaws, disc packs or bolts around it. */
  readonly elements: number | null;
}
