import { baselineRules } from '../detection/baseline.ts';
import { counted } from './level-words.ts';
import { gather } from './ranking.ts';
import type { PointNow, SummaryFacts } from './summary-facts.ts';
import { foreign, idText, placeText } from './wording.ts';

/**
 * What the summary says of limits that are learned: which bands nothing judges now and why, whose baseline is not yet
 * to be trusted, was refused, or stands by a person's word. Empty where there is nothing to say.
 */
export function learnedLines(facts: SummaryFacts): string[] {
  const points = facts.points.filter(({ judging }) => judging !== 'out-of-service');
  const known = points.flatMap((point) => baselinesOf(point));
  return [
    ...unjudgedLines(points),
    ...stateLine(known, 'learning', 'Still learning', baselineRules.provisionalDays),
    ...stateLine(known, 'provisional', 'Provisional baselines', baselineRules.learnedDays),
    ...refusedLines(known),
    ...confirmedLines(known),
  ];
}

const mostPlaces = 3;
const mostReasons = 3;

/** Bands that have limits, none of which can be reckoned: nobody shall take them for watched. */
function unjudgedLines(points: readonly PointNow[]): string[] {
  const unjudged = points.flatMap(({ machine, point, bands }) =>
    bands.flatMap(({ band, limits }) => {
      const why = limits.map(({ unknown }) => unknown);
      return why.length === 0 || why.includes(undefined)
        ? []
        : [{ place: `${placeText(machine, point)} (${idText(band.id)})`, why: why[0] as string }];
    }),
  );
  const groups = gather(unjudged, ({ why }) => why).sort((a, b) => b.length - a.length);
  const lines = groups.slice(0, mostReasons).map((group) => {
    const [{ why }] = group as [(typeof group)[0]];
    const places = listed(group.map(({ place }) => place));
    return `${counted(group.length, 'band')} not judged, ${foreign(why)}: ${places}.`;
  });
  const rest = groups.slice(mostReasons).flat().length;
  return rest === 0 ? lines : [...lines, `${counted(rest, 'band')} more not judged for other reasons.`];
}

interface Known {
  readonly machineId: string;
  /** 'Aeration blower 1, drive end, horizontal (bearing, full-load)'. */
  readonly place: string;
  readonly baseline: NonNullable<PointNow['bands'][number]['baselines']>[number];
}

function baselinesOf({ machine, point, bands }: PointNow): Known[] {
  return bands.flatMap(({ band, baselines = [] }) =>
    baselines.map((baseline) => {
      const condition = baseline.condition === '' ? '' : `, ${idText(baseline.condition)}`;
      const place = `${placeText(machine, point)} (${idText(band.id)}${condition})`;
      return { machineId: machine.id, place, baseline };
    }),
  );
}

function stateLine(
  known: readonly Known[],
  state: 'learning' | 'provisional',
  title: string,
  daysWanted: number,
): string[] {
  const those = known.filter(({ baseline }) => baseline.state === state);
  if (those.length === 0) return [];
  const fewest = Math.min(...those.map(({ baseline }) => baseline.runningDays));
  const days = `${fewest} of ${daysWanted} running days`;
  const at = those.length === 1 ? days : `from ${days} on`;
  return [`${title}: ${those.length}, ${at}: ${listed(those.map(({ place }) => place))}.`];
}

function refusedLines(known: readonly Known[]): string[] {
  const refused = known.filter(({ baseline }) => baseline.state === 'refused');
  const [first] = refused;
  if (first === undefined) return [];
  const places = listed(refused.map(({ place, baseline }) => `${place}: ${foreign(baseline.refused ?? '')}`));
  return [
    `Baselines refused, no limit is reckoned from them: ${places}. See 'humledger baseline ${idText(first.machineId)}'; confirm, or have it learned again.`,
  ];
}

/** Whoever stands for a baseline is named: it may have been learned on a bad machine. */
function confirmedLines(known: readonly Known[]): string[] {
  const confirmed = known.filter(({ baseline }) => baseline.confirmedBy !== null);
  return gather(confirmed, ({ baseline }) => baseline.confirmedBy ?? '').map((group) => {
    const [{ baseline }] = group as [Known];
    return `Baseline confirmed by ${foreign(baseline.confirmedBy ?? '')}: ${listed(group.map(({ place }) => place))}.`;
  });
}

function listed(places: readonly string[]): string {
  const rest = places.length - mostPlaces;
  return `${places.slice(0, mostPlaces).join('; ')}${rest > 0 ? `; and ${rest} more` : ''}`;
}
