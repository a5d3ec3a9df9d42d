import type { Severity } from '../config/site.ts';
import { actionText, respondByText, whereText } from './alarm-mail.ts';
import { clip } from './escape.ts';
import { evidenceLines } from './evidence-facts.ts';
import type { StandingAlarm } from './facts.ts';
import { markWord } from './letter.ts';
import { changeText, distanceText, levelText, measuredText, percentText } from './level-words.ts';
import { bearingOf, comparedWith, firstLimit, largestShare } from './ranking.ts';
import { sisterText } from './sister-words.ts';
import type { Standing } from './summary.ts';
import type { BandNow, SummaryFacts } from './summary-facts.ts';
import type { Worse } from './summary-worse.ts';
import { durationText, shortMomentText } from './time-words.ts';
import { trendInShort } from './trend-words.ts';
import { idText, isReturned, nameOf, placeText, shortAdvice, standingText, troubleName } from './wording.ts';
import { zoneChangeText } from './zone-words.ts';

/** One line of the summary: a bearing (or other place) with all that is to say of it. */
export interface Finding {
  readonly mark: Severity | null;
  readonly number: number | null;
  readonly text: string;
  /** What to do, by when; null where nobody need do anything today. */
  readonly todo: string | null;
  /** Further numbers or directions of the same bearing. */
  readonly also: readonly string[];
  /** Since when, and its state; null where the text says it. */
  readonly since: string | null;
}

/** Directions of one bearing, the most urgent first: it leads, the others follow with their numbers. */
export function needFinding(group: readonly Standing[], facts: SummaryFacts): Finding {
  const first = group[0] as Standing;
  const { timeZone } = facts.site;
  const respond =
    first.respondByMs === null ? '' : ` ${respondByText(first.respondByMs, facts.writtenMs, timeZone)}`;
  return {
    mark: severityOf(first),
    number: first.number,
    text: findingText(first),
    todo: `${todoText(first)}${respond}`,
    also: [
      ...trendLine(first, facts),
      ...alsoLines(group, facts),
      ...sisterLines(group, facts),
      ...evidenceOf(group),
    ],
    since: `${sinceText(first, facts)}, ${first.untoldDanger === true ? 'rose to danger while ' : ''}${standingText(first, timeZone)}.`,
  };
}

/** What somebody has already taken in hand: one line each. */
export function knownFinding(group: readonly Standing[], facts: SummaryFacts): Finding {
  const first = group[0] as Standing;
  return {
    mark: severityOf(first),
    number: first.number,
    text: `${findingText(first)}; ${standingText(first, facts.site.timeZone)}`,
    todo: null,
    also: [...trendLine(first, facts), ...alsoLines(group, facts)],
    since: null,
  };
}

export function worseFinding(group: readonly Worse[], timeZone: string): Finding {
  const first = group[0] as Worse;
  const others = group.slice(1).map((worse) => {
    const said = [worseText(worse), ...besideText(worse, timeZone)];
    return `${directionOf(worse)} ${said.join('; ')}`;
  });
  return {
    mark: null,
    number: null,
    text: `${placeText(first.machine, first.point)}: ${worseText(first)}`,
    todo: null,
    also: [
      ...besideText(first, timeZone).map(sentence),
      ...(others.length === 0 ? [] : [`Also ${others.join('; ')}`]),
    ],
    since: null,
  };
}

function worseText({ now }: Worse): string {
  const change = now.change === null ? 'changed' : changeText(now.change.ratio);
  const usual = now.change === null ? '' : ` (ordinary spread ${percentText(now.change.ordinaryRatio - 1)})`;
  if (now.level === null) return `${idText(now.band.id)} ${change}${usual}`;
  const share = largestShare(now.level.level, now.limits);
  const used = share === null ? 'no limit' : `${percentText(share)} of the alert limit`;
  const significant = now.zone === null ? null : zoneChangeText(now.zone, now.band.display);
  const byStandard = significant === null ? '' : `; ${significant}`;
  return `${idText(now.band.id)} ${change} on the week${usual}, now ${measuredText(now.level, now.band.display)}, ${used}${byStandard}`;
}

/** What the days say, and the sister machines. */
function besideText({ now }: Worse, timeZone: string): string[] {
  const trend = now.trend == null ? null : trendInShort(now.trend, now.band.display, timeZone);
  const sister = now.sister?.leaves === true ? sisterText(now.sister) : null;
  return [trend, sister].filter((said) => said !== null);
}

function sentence(said: string): string {
  return said.charAt(0).toUpperCase() + said.slice(1);
}

/** The direction where the bearing has been named, else the point. */
function directionOf({ point }: Pick<Worse, 'point'>): string {
  return bearingOf(point) === point.name || point.direction === null
    ? nameOf(point)
    : clip(point.direction, 24);
}

function severityOf(item: Standing): Severity {
  return item.kind === 'alarm' ? item.severity : 'trouble';
}

function findingText(item: Standing): string {
  if (item.kind === 'trouble') return `${whereText(item)}: ${whatText(item)}`;
  return `${placeText(item.machine, item.point)}: ${whatText(item)}`;
}

function whatText(item: Standing): string {
  if (item.kind === 'trouble') {
    return item.detail === null
      ? troubleName[item.trouble]
      : `${troubleName[item.trouble]} (${clip(item.detail, 120)})`;
  }
  return alarmText(item);
}

function trendLine(item: Standing, facts: SummaryFacts): string[] {
  return trendSaid(item, facts).map(sentence);
}

/** What the days say of an alarm's band, where they say something. */
function trendSaid(item: Standing, facts: SummaryFacts): string[] {
  if (item.kind !== 'alarm') return [];
  const trend = bandNowOf(item, facts)?.trend;
  const said = trend == null ? null : trendInShort(trend, item.band.display, facts.site.timeZone);
  return said === null ? [] : [said];
}

/** The band of an alarm as it is now. */
export function bandNowOf(
  { machine, point, band }: StandingAlarm,
  { points }: SummaryFacts,
): BandNow | undefined {
  return points
    .find((one) => one.machine.id === machine.id && one.point.id === point.id)
    ?.bands.find((one) => one.band.id === band.id);
}

function alarmText({ band, level, limit, severity, change, dangerUnconfirmed }: StandingAlarm): string {
  if (level === null) return `${idText(band.id)}, no level now`;
  const at = limit[severity] ?? firstLimit(limit);
  const beside =
    limit.unknown === undefined ? '' : `, its limit not reckoned now (${clip(limit.unknown, 120)})`;
  const compared = comparedWith(limit, level.level);
  const distance =
    at === null ? beside : `, ${distanceText(compared, at)} ${severity} (${levelText(at, band.display)})`;
  const trend = change === null ? '' : `, ${changeText(change.ratio)} on the week`;
  const unconfirmed = dangerUnconfirmed ? ', over danger in the newest recording, not yet confirmed' : '';
  return `${idText(band.id)} ${measuredText(level, band.display)}${distance}${trend}${unconfirmed}`;
}

/** 'Also ALERT 18 vertical: ...': every further number of the group, so that none is hidden. */
function alsoLines(group: readonly Standing[], facts: SummaryFacts): string[] {
  return group.slice(1).map((item) => {
    const where = item.point === null ? 'the same' : directionOf({ point: item.point });
    const over = isReturned(item) ? ['back to normal, unacknowledged'] : [];
    const said = [whatText(item), ...over, ...trendSaid(item, facts)].join('; ');
    return `Also ${markWord[severityOf(item)]} ${item.number}, ${where}: ${said}`;
  });
}

/** Which of the group's bands leave their sister machines. */
function sisterLines(group: readonly Standing[], facts: SummaryFacts): string[] {
  return group.flatMap((item) => {
    const sister = item.kind === 'alarm' ? bandNowOf(item, facts)?.sister : null;
    if (item.kind !== 'alarm' || sister?.leaves !== true) return [];
    return [sentence(`${idText(item.band.id)} ${sisterText(sister)}`)];
  });
}

/** What the lines of the bearing's directions say of its parts, each sentence once. */
function evidenceOf(group: readonly Standing[]): string[] {
  const said = group.flatMap((item) => (item.kind === 'alarm' ? evidenceLines(item.evidence) : []));
  return [...new Set(said)].slice(0, 2).map(sentence);
}

function sinceText(item: Standing, { site, writtenMs }: SummaryFacts): string {
  return `Since ${shortMomentText(item.sinceMs, site.timeZone)} (${durationText(writtenMs - item.sinceMs)})`;
}

function todoText(item: Standing): string {
  if (isReturned(item)) {
    return item.kind === 'trouble'
      ? 'It is over; find out what it was, then acknowledge.'
      : 'The level is back within its limit; find out why it rose, then acknowledge.';
  }
  return item.kind === 'alarm' ? actionText(item.action, item.machine) : shortAdvice(item.trouble);
}
