import type { BearingGeometry, BearingMultiples } from './parts.ts';
import { printNumber } from './print-value.ts';

/** A number of a bearing that cannot be right beside the others. */
export interface BearingFinding {
  readonly key: keyof BearingMultiples;
  readonly what: string;
  readonly right: string;
}

/** A list of multiples is rounded, and may be measured with some slip. */
const rounding = 0.1;
const sizesAgree = 0.05;
/** An element spins at most as fast as with no angle of contact; twice that is the rate of its strikes. */
const faster = 1.15;

/**
 * What contradicts the geometry that all of a bearing's multiples come from (Randall & Antoni 2011, equations 1 to 4):
 * BPFO = n (1 - q)/2, BPFI = n (1 + q)/2, FTF = (1 -+ q)/2, BSF = D (1 - q^2)/(2 d), and d/D is at least q. Null: nothing.
 * A wrong multiple would name a sound bearing, or none.
 */
export function judgeBearing(
  multiples: BearingMultiples,
  geometry: BearingGeometry | null,
  turningRing: 'inner' | 'outer',
): BearingFinding | null {
  return (
    judgeRaces(multiples) ??
    judgeCage(multiples, turningRing) ??
    judgeSpin(multiples) ??
    (geometry === null ? null : judgeSizes(multiples, geometry, turningRing))
  );
}

function judgeRaces({ bpfo, bpfi }: BearingMultiples): BearingFinding | null {
  if (bpfo === null || bpfi === null) return null;
  if (bpfo >= bpfi)
    return {
      key: 'bpfo',
      what: `bpfo of ${turns(bpfo)} is not below bpfi of ${turns(bpfi)}, and an outer race is passed less often`,
      right: `write: bpfo: ${turns(bpfi)} and bpfi: ${turns(bpfo)}`,
    };
  const elements = bpfo + bpfi;
  if (Math.abs(elements - Math.round(elements)) <= rounding) return null;
  return {
    key: 'bpfo',
    what: `bpfo and bpfi add up to ${printNumber(elements)}x, which is no number of elements`,
    right: "compare both with the maker's list",
  };
}

function judgeCage({ ftf }: BearingMultiples, turningRing: 'inner' | 'outer'): BearingFinding | null {
  if (ftf === null || ftf < 0.5 === (turningRing === 'inner')) return null;
  const [other, remedy] =
    turningRing === 'inner' ? ['outer', 'add turning_ring: outer'] : ['inner', 'leave turning_ring out'];
  const mirrored = ftf < 1 ? `, or write: ftf: ${turns(1 - ftf)}` : '';
  return {
    key: 'ftf',
    what: `ftf of ${turns(ftf)} is that of a bearing whose ${other} ring turns`,
    right: `${remedy}${mirrored}`,
  };
}

function judgeSpin({ ftf, bsf, bpfo, bpfi }: BearingMultiples): BearingFinding | null {
  const q =
    bpfo !== null && bpfi !== null ? (bpfi - bpfo) / (bpfi + bpfo) : ftf === null ? 0 : Math.abs(1 - 2 * ftf);
  if (bsf === null || q <= 0 || bsf <= (faster * (1 - q * q)) / (2 * q)) return null;
  return {
    key: 'bsf',
    what: `bsf of ${turns(bsf)} is twice what an element of this bearing spins`,
    right: `write: bsf: ${printNumber(bsf / 2, 6)}x`,
  };
}

function judgeSizes(
  multiples: BearingMultiples,
  { rollingElements: n, elementDiameter, pitchDiameter, contactAngleDeg }: BearingGeometry,
  turningRing: 'inner' | 'outer',
): BearingFinding | null {
  const ratio = elementDiameter / pitchDiameter;
  const q = ratio * Math.cos((contactAngleDeg * Math.PI) / 180);
  const bySizes = {
    ftf: (turningRing === 'inner' ? 1 - q : 1 + q) / 2,
    bsf: (1 - q * q) / (2 * ratio),
    bpfo: (n * (1 - q)) / 2,
    bpfi: (n * (1 + q)) / 2,
  };
  for (const key of ['bpfo', 'bpfi', 'ftf', 'bsf'] as const) {
    const given = multiples[key];
    if (given === null || Math.abs(given / bySizes[key] - 1) <= sizesAgree) continue;
    const what = `${key} of ${turns(given)} is not what the sizes give, ${turns(bySizes[key])}`;
    return { key, what, right: `leave ${key} out, or the sizes` };
  }
  return null;
}

function turns(multiple: number): string {
  return `${printNumber(multiple, 4)}x`;
}
