import { printNumber } from '../config/print-value.ts';
import type { MachineFacts } from './facts.ts';
import type { SummaryFacts } from './summary-facts.ts';
import { idText, nameOf, placeText } from './wording.ts';

/** A band of a machine that lies above the same band of its sister machines. */
export interface SisterFacts {
  /** Of the newest day's median to the median of theirs. */
  readonly ratio: number;
  /** The same on the days before. */
  readonly usualRatio: number;
  readonly sisters: readonly MachineFacts[];
  /** It came there of itself; not: it lies there as before. */
  readonly leaves: boolean;
}

const mostNames = 3;
const mostPlaces = 3;

/** 'leaves its sisters: 2.1 times the median of Aeration blower 1, Aeration blower 3 (1.1 before)'. */
export function sisterText({ ratio, usualRatio, sisters }: SisterFacts): string {
  const of = sisters.length === 1 ? '' : 'the median of ';
  const whose = sisters.length === 1 ? 'its sister' : 'its sisters';
  return `leaves ${whose}: ${times(ratio)} ${of}${namesText(sisters)} (${printNumber(usualRatio, 2)} before)`;
}

/**
 * One line for all bands that lie apart from their sisters as they did before: nothing got worse, but whoever knows the
 * machines may know why.
 */
export function apartLines({ points }: SummaryFacts): string[] {
  const apart = points.flatMap(({ machine, point, bands }) =>
    bands.flatMap(({ band, sister }) =>
      sister == null || sister.leaves
        ? []
        : [`${placeText(machine, point)} (${idText(band.id)} ${times(sister.ratio)})`],
    ),
  );
  if (apart.length === 0) return [];
  const rest = apart.length - mostPlaces;
  const more = rest > 0 ? `; and ${rest} more` : '';
  return [`Above their sister machines, as before: ${apart.slice(0, mostPlaces).join('; ')}${more}.`];
}

function times(ratio: number): string {
  return `${printNumber(ratio, 2)} times`;
}

function namesText(sisters: readonly MachineFacts[]): string {
  const rest = sisters.length - mostNames;
  const named = sisters.slice(0, mostNames).map(nameOf).join(', ');
  return rest > 0 ? `${named} and ${rest} more` : named;
}
