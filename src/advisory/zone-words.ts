import { differenceUnit } from '../config/print-value.ts';
import type { DisplayUnit } from '../config/site.ts';
import { worstZone, type ZoneLetter } from '../config/zone-tables.ts';
import type { MachineFacts, PointFacts, ZoneFacts } from './facts.ts';
import type { Said } from './letter.ts';
import { bareLevel, levelText, unitText } from './level-words.ts';
import type { PointNow } from './summary-facts.ts';
import { foreign, nameOf } from './wording.ts';

/** Zones as people get them: the letter, the table it is of, the boundaries beside it. */

/** 'Zone C of ISO 20816-3 (group 2, rigid); B/C at 2.8 mm/s r.m.s., C/D at 4.5 mm/s r.m.s.' */
export function zoneSaid(zone: ZoneFacts, display: DisplayUnit): Said {
  const machine =
    zone.machine === null
      ? ''
      : `; ${nameOf(zone.machine.point)} is in zone ${zone.machine.letter}, and so the machine`;
  if (zone.letter === null)
    return `no zone of ${foreign(zone.table)}: ${foreign(zone.why ?? 'not known')}${machine}`;
  const at = boundaryWords(zone.letter, zone, display);
  const change = zoneChangeText(zone, display);
  return {
    before: zone.atLeast ? 'At least zone ' : 'Zone ',
    zone: zone.letter,
    after: ` of ${foreign(zone.table)}${at === '' ? '' : `; ${at}`}${change === null ? '' : `; ${change}`}${machine}`,
  };
}

const beside = { A: ['ab'], B: ['ab', 'bc'], C: ['bc', 'cd'], D: ['cd'] } as const;
const boundaryName = { ab: 'A/B', bc: 'B/C', cd: 'C/D' } as const;

/** The boundaries on both sides of a zone. */
function boundaryWords(letter: ZoneLetter, { boundaries }: ZoneFacts, display: DisplayUnit): string {
  if (boundaries === null) return '';
  return beside[letter]
    .map((name) => `${boundaryName[name]} at ${levelText(boundaries[name], display)}`)
    .join(', ');
}

/** 'A/B 1.4, B/C 2.8, C/D 4.5 mm/s r.m.s.' */
export function allBoundaries(
  boundaries: NonNullable<ZoneFacts['boundaries']>,
  display: DisplayUnit,
): string {
  const said = (['ab', 'bc', 'cd'] as const).map(
    (name) => `${boundaryName[name]} ${bareLevel(boundaries[name], display)}`,
  );
  return `${said.join(', ')} ${unitText(display)}`;
}

/** What ISO 10816-1 and -3 call significant (5.3); null where it is not, or nothing is there to compare with. */
export function zoneChangeText({ change }: Pick<ZoneFacts, 'change'>, display: DisplayUnit): string | null {
  if (change === null || !change.significant) return null;
  const unit = differenceUnit(display);
  const by = unit === display ? bareLevel(Math.abs(change.by), unit) : levelText(Math.abs(change.by), unit);
  const than = change.since === 'baseline' ? 'than the baseline' : 'than a week ago';
  return `${by} ${change.by > 0 ? 'more' : 'less'} ${than} (${bareLevel(change.reference, unit)}), over 25 % of B/C (${bareLevel(change.threshold, unit)}): significant, up or down`;
}

/** The machine's zone in the summary: the worst of its points of today, with the one that is in it. */
export function machineZoneNow(points: readonly PointNow[]): {
  readonly machine: MachineFacts;
  readonly point: PointFacts;
  readonly letter: ZoneLetter;
  readonly table: string;
} | null {
  const today = points.filter(({ judging }) => judging === 'judged' || judging === 'no-limit');
  const found = today.flatMap(({ machine, point, bands }) =>
    bands.flatMap(({ zone }) =>
      zone === null || zone.letter === null
        ? []
        : [{ machine, point, letter: zone.letter, table: zone.table }],
    ),
  );
  const worst = worstZone(found.map(({ letter }) => letter));
  return found.find(({ letter }) => letter === worst) ?? null;
}
