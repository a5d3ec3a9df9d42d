import type { Severity } from '../config/site.ts';
import { needsAcknowledging } from './alarm-mail.ts';
import type { MachineFacts, PointFacts, StandingAlarm, TroubleFacts } from './facts.ts';
import { counted } from './level-words.ts';
import { bearingOf, byUrgency, gather, shareOfAlert } from './ranking.ts';
import { repairFinding } from './repair-words.ts';
import { apartLines } from './sister-words.ts';
import { historyLines, recordingLines, serviceLines } from './summary-counts.ts';
import type { PointNow, SummaryFacts } from './summary-facts.ts';
import { bandNowOf, type Finding, knownFinding, needFinding, worseFinding } from './summary-findings.ts';
import { outOfServiceLines, planLines } from './summary-held.ts';
import { learnedLines } from './summary-limits.ts';
import { nothingWorse, type Worse, worseOf } from './summary-worse.ts';
import { isProjected } from './trend-words.ts';
import { isReturned, placeText, troubleName } from './wording.ts';

/** The morning as data: what needs a person first, in ordered sections, before it becomes text or HTML. */
export interface Morning {
  /** '2 machines need a person today; 58 of 60 points judged, 1 stopped, 1 blind: ...'. */
  readonly first: string;
  readonly sections: readonly Section[];
  /** Something is said of when a limit would be reached, which needs its caution. */
  readonly projects: boolean;
}

export interface Section {
  readonly name:
    | 'needs'
    | 'worse'
    | 'known'
    | 'steady'
    | 'repairs'
    | 'limits'
    | 'recordings'
    | 'history'
    | 'service';
  readonly title: string;
  /** Every finding, the most urgent first; a screen shows `mostShown` of them, then 'and n more'. */
  readonly findings: readonly Finding[];
  /** Plain lines of counts; or what is said where there is no finding. */
  readonly lines: readonly string[];
}

export const mostShown = 5;

export type Standing = StandingAlarm | TroubleFacts;

/**
 * Whether a standing alarm or trouble needs somebody today: not acknowledged, or the time to respond has passed, or
 * worse in spite of the acknowledgement, or over the danger limit and not yet confirmed. What a person has shelved or
 * taken out of service does not, unless it rose to danger on the shelf; a danger that only the site file holds back does,
 * for nobody has seen it.
 */
export function needsPerson(standing: Standing, nowMs: number): boolean {
  if (standing.standing === 'shelved') return standing.untoldDanger === true;
  if (standing.standing === 'out-of-service' || standing.standing === 'normal') return false;
  if (standing.standing === 'suppressed')
    return standing.kind === 'alarm' && standing.severity === 'danger' && standing.acknowledgedMs === null;
  // Nothing is left to do about a trouble that is over: being told here acknowledges it.
  if (standing.kind === 'trouble' && isReturned(standing)) return false;
  if (needsAcknowledging(standing)) return true;
  if (standing.standing === 'latched-acknowledged') return false;
  if (standing.respondByMs !== null && standing.respondByMs < nowMs) return true;
  return standing.kind === 'alarm' && (standing.change?.worse === true || standing.dangerUnconfirmed);
}

export function morningOf(facts: SummaryFacts): Morning {
  const standing = facts.standing.filter((item) => item.standing !== 'normal');
  const needs = inGroups(standing.filter((item) => needsPerson(item, facts.writtenMs)));
  const known = inGroups(standing.filter((item) => !needsPerson(item, facts.writtenMs)));
  const worse = worseOf(facts, standing);
  const worseGroups = gather(worse, ({ machine, point }) => `${machine.id}\n${bearingOf(point)}`);
  const sections: Section[] = [
    {
      name: 'needs',
      title: 'Needs a person today',
      findings: needs.map((group) => needFinding(group, facts)),
      lines: needs.length === 0 ? ['Nothing.'] : [],
    },
    {
      name: 'worse',
      title: 'Worse, no limit passed',
      findings: worseGroups.map((group) => worseFinding(group, facts.site.timeZone)),
      lines: worse.length === 0 ? [nothingWorse(facts)] : [],
    },
    {
      name: 'known',
      title: 'Already known',
      findings: known.map((group) => knownFinding(group, facts)),
      lines: knownLines(facts, known.length),
    },
    {
      name: 'steady',
      title: 'Steady or better',
      findings: [],
      lines: [
        `${steadyCount(facts, standing, worse)} of ${counted(facts.points.length, 'point')}.`,
        ...apartLines(facts),
      ],
    },
    ...repairSection(facts),
    ...learnedSection(facts),
    { name: 'recordings', title: 'Recordings', findings: [], lines: recordingLines(facts) },
    { name: 'history', title: 'Alarms', findings: [], lines: [...historyLines(facts), ...planLines(facts)] },
    { name: 'service', title: 'The service', findings: [], lines: serviceLines(facts) },
  ];
  const shown = [
    ...worse.map(({ now }) => now),
    ...standing.map((item) => (item.kind === 'alarm' ? bandNowOf(item, facts) : undefined)),
  ];
  return {
    first: firstLine(facts, needs.flat()),
    sections,
    projects: shown.some((now) => isProjected(now?.trend)),
  };
}

function knownLines(facts: SummaryFacts, findings: number): string[] {
  const out = outOfServiceLines(facts);
  return findings + out.length === 0 ? ['Nothing.'] : out;
}

/** Only while the fourteen days after a repair last. */
function repairSection({ repairs = [], site }: SummaryFacts): Section[] {
  if (repairs.length === 0) return [];
  const findings = repairs.map((repair) => repairFinding(repair, site.timeZone));
  return [{ name: 'repairs', title: 'After repairs', findings, lines: [] }];
}

/** Only where there is something to say of limits that are learned. */
function learnedSection(facts: SummaryFacts): Section[] {
  const lines = learnedLines(facts);
  return lines.length === 0 ? [] : [{ name: 'limits', title: 'Learned limits', findings: [], lines }];
}

/** Alarms and troubles of one bearing make one finding; the most urgent first. In a finding, what is over stands last. */
function inGroups(items: readonly Standing[]): Standing[][] {
  const ordered = [...items].sort((a, b) => byUrgency(rankOf(a), rankOf(b)) || a.number - b.number);
  const groups = gather(ordered, (item) => {
    if (item.machine === null || item.point === null) return `number ${item.number}`;
    return `${item.machine.id}\n${bearingOf(item.point)}`;
  });
  return groups.map((group) => [...group].sort((a, b) => Number(isReturned(a)) - Number(isReturned(b))));
}

function rankOf(item: Standing): { machine: MachineFacts | null; severity: Severity; share: number | null } {
  if (item.kind === 'trouble') return { machine: item.machine, severity: 'trouble', share: null };
  const share = item.level === null ? null : shareOfAlert(item.level.level, item.limit);
  return { machine: item.machine, severity: item.severity, share };
}

function pointKey(machine: MachineFacts | null, point: PointFacts | null): string {
  return `${machine?.id}\n${point?.id}`;
}

/** Judged points of which nothing stands and nothing got worse. */
function steadyCount(facts: SummaryFacts, standing: readonly Standing[], worse: readonly Worse[]): number {
  const spokenOf = new Set([...standing, ...worse].map(({ machine, point }) => pointKey(machine, point)));
  return facts.points.filter(
    ({ machine, point, judging }) => judging === 'judged' && !spokenOf.has(pointKey(machine, point)),
  ).length;
}

function firstLine(facts: SummaryFacts, needs: readonly Standing[]): string {
  const machines = new Set(needs.flatMap(({ machine }) => (machine === null ? [] : [machine.id]))).size;
  const elsewhere = needs.filter(({ machine }) => machine === null).length;
  const who: string[] = [];
  if (machines > 0) who.push(counted(machines, 'machine'));
  if (elsewhere > 0)
    who.push(
      counted(elsewhere, 'trouble of logger, files or service', 'troubles of logger, files or service'),
    );
  const verb = machines + elsewhere === 1 ? 'needs' : 'need';
  const needed =
    who.length === 0 ? 'No machine needs a person today' : `${who.join(' and ')} ${verb} a person today`;
  return `${needed}; ${judgingText(facts)}`;
}

/** '58 of 60 points judged, 1 stopped, 1 blind: Sludge pump 2, drive end (dead sensor).' */
function judgingText({ points, standing }: SummaryFacts): string {
  const of = (judging: PointNow['judging']) => points.filter((point) => point.judging === judging);
  const counts = [`${of('judged').length} of ${counted(points.length, 'point')} judged`];
  const others = [
    ['stopped', 'stopped'],
    ['not-judged', 'not judged'],
    ['no-limit', 'without a limit'],
    ['out-of-service', 'out of service'],
  ] as const;
  for (const [judging, words] of others) {
    const count = of(judging).length;
    if (count > 0) counts.push(`${count} ${words}`);
  }
  const blind = of('blind');
  if (blind.length === 0) return `${counts.join(', ')}.`;
  const named = blind.slice(0, 3).map(({ machine, point }) => {
    const trouble = standing.find(
      (item) => item.kind === 'trouble' && pointKey(item.machine, item.point) === pointKey(machine, point),
    );
    const why = trouble?.kind === 'trouble' ? ` (${troubleName[trouble.trouble]})` : '';
    return `${placeText(machine, point)}${why}`;
  });
  const rest = blind.length > named.length ? `; and ${blind.length - named.length} more` : '';
  return `${counts.join(', ')}, ${blind.length} blind: ${named.join('; ')}${rest}.`;
}
