/**
 * What the lines of one recording say of a part: plain data, made by the assessment, kept by the ledger. It is evidence,
 * graded, and never a verdict.
 */
export type Evidence = FaultEvidence | NotSeparable;

export type EvidenceGrade = 'weak' | 'clear' | 'strong';

interface AboutPart {
  readonly partId: string;
  /** What would be damaged: 'outer race'. */
  readonly fault: string;
  /** The frequency by its name in the trade: 'BPFO'. */
  readonly frequency: string;
  readonly spectrum: 'envelope' | 'plain';
  /** By formula and observed speed, Hz. */
  readonly expectedHz: number;
  /** One sentence for people, without its caution. */
  readonly words: string;
}

/** A family of lines stands out where a fault of the part would make it. */
export interface FaultEvidence extends AboutPart {
  readonly grade: EvidenceGrade;
  /** Sound machines may show it as well: it is told, and names no fault. Left out: it speaks for a fault. */
  readonly isObservation?: true;
  /** The other spectrum of the point, where the same family stands as well. */
  readonly alsoIn?: 'envelope' | 'plain';
  readonly observedHz: number;
  /** Harmonics that stand out, the fundamental included, and sidebands. */
  readonly harmonics: number;
  readonly sidebands: number;
  /** The strongest of them over the local floor. */
  readonly aboveFloorDb: number;
  /** Chance that lines like these stand out by accident. */
  readonly chance: number;
}

/** A line stands where it would be, and where a shaft's harmonic is: it says nothing of the part. */
export interface NotSeparable extends AboutPart {
  readonly grade: 'not separable';
  /** Line spacing that would tell the two apart, Hz. */
  readonly neededLineSpacingHz: number;
}

/** Lines that stand out where a part makes them; whether for a fault, `isObservation` says. */
export function isFaultEvidence(evidence: Evidence): evidence is FaultEvidence {
  return evidence.grade !== 'not separable';
}

/** Whether it speaks for a fault, and so has a place in a message. */
export function speaksForFault(evidence: Evidence): evidence is FaultEvidence {
  return isFaultEvidence(evidence) && evidence.isObservation !== true;
}
