import { subjectLine } from './alarm-mail.ts';
import type { Mail } from './facts.ts';
import type { Block, Letter, Said } from './letter.ts';
import { letterHtml } from './letter-html.ts';
import { letterText } from './letter-text.ts';
import { bareLevel, changeText, counted, percentText, unitText } from './level-words.ts';
import { gather, shareOfAlert } from './ranking.ts';
import { repairHeads, repairRows, repairTitle } from './repair-words.ts';
import { type Morning, morningOf, mostShown, type Section } from './summary.ts';
import type { BandNow, PointNow, SummaryFacts } from './summary-facts.ts';
import { dateText, momentText, shortMomentText } from './time-words.ts';
import { acknowledgeCommand, caution, foreign, idText, nameOf, zoneText } from './wording.ts';
import { machineZoneNow } from './zone-words.ts';

/** Rows of the full tables that a mail carries at most; the file has them all. */
const mostTableRows = 800;
const projection =
  'When a limit would be reached goes by the daily medians of the last 30 days and the same growth, percent for percent. A projection, not a promise.';
/** Bytes of HTML that mail programs still show without cutting or complaint. */
const mostHtmlBytes = 300_000;

/** The morning's mail; a large site's tables are cut short until the mail is small enough. */
export function summaryMail(facts: SummaryFacts): Mail {
  const morning = morningOf(facts);
  let rows = mostTableRows;
  for (;;) {
    const letter = summaryLetter(facts, morning, rows);
    const html = letterHtml(letter);
    if (rows === 0 || new TextEncoder().encode(html).length < mostHtmlBytes) {
      return { subject: summarySubject(facts, morning), text: letterText(letter), html };
    }
    rows = Math.floor(rows / 2);
  }
}

/** What is written to `data/summary/latest.html`: the mail's HTML with every row of its tables. */
export function summaryFile(facts: SummaryFacts): string {
  return letterHtml(summaryLetter(facts, morningOf(facts), Number.POSITIVE_INFINITY));
}

/** 'Larkfen Waterworks, Tue 1 Dec 2026: 2 machines need a person today'. */
export function summarySubject(facts: SummaryFacts, morning = morningOf(facts)): string {
  const [first] = morning.first.split(';');
  return subjectLine(`${nameOf(facts.site)}, ${dateText(facts.writtenMs, facts.site.timeZone)}: ${first}`);
}

export function summaryLetter(facts: SummaryFacts, morning: Morning, mostRows: number): Letter {
  const { timeZone } = facts.site;
  const blocks: Block[] = [
    ...morning.sections.flatMap(screenBlocks),
    { kind: 'closing', text: `${zoneText(timeZone)} Change: the last 24 hours against the 7 days before.` },
    ...(morning.projects ? [{ kind: 'closing', text: projection } as const] : []),
    { kind: 'closing', text: caution },
    ...morning.sections.flatMap(restBlocks),
    ...repairBlocks(facts),
    ...tableBlocks(facts, mostRows),
  ];
  return {
    lead: morning.first,
    head: `${nameOf(facts.site)}, ${momentText(facts.writtenMs, timeZone)}`,
    test: false,
    blocks,
  };
}

/** Every band that a repair is judged by. */
function repairBlocks({ repairs = [], site }: SummaryFacts): Block[] {
  return repairs
    .filter(({ bands }) => bands.length > 0)
    .flatMap((repair): Block[] => [
      { kind: 'heading', text: `Before and after, ${repairTitle(repair, site.timeZone)}` },
      { kind: 'table', heads: repairHeads, rows: repairRows(repair) },
    ]);
}

/** A section as the first screen shows it: five findings, then how many more. */
function screenBlocks(section: Section): Block[] {
  const shown = section.findings.slice(0, mostShown);
  const rest = section.findings.length - shown.length;
  const blocks: Block[] = [
    { kind: 'heading', text: section.title },
    ...shown.map(({ mark, number, text, todo, also, since }): Block => {
      return {
        kind: 'finding',
        mark,
        number,
        text,
        more: [todo, ...also, since].filter((line) => line !== null),
      };
    }),
    ...(section.lines.length === 0 ? [] : [{ kind: 'paragraph' as const, text: section.lines.join(' ') }]),
  ];
  if (rest > 0) blocks.push({ kind: 'paragraph', text: `And ${rest} more, listed below.` });
  if (section.name === 'needs' && shown.some(({ number }) => number !== null)) {
    blocks.push({ kind: 'command', text: acknowledgeCommand('NUMBER') });
  }
  return blocks;
}

/** The findings that the first screen had no room for, without what to do: there may be hundreds when a network fails. */
function restBlocks(section: Section): Block[] {
  const rest = section.findings.slice(mostShown);
  if (rest.length === 0) return [];
  return [
    { kind: 'heading', text: `${section.title}, the others` },
    ...rest.map(({ mark, number, text, also, since }): Block => {
      return { kind: 'finding', mark, number, text, more: [...also, since].filter((line) => line !== null) };
    }),
  ];
}

const judgingWord: Readonly<Record<PointNow['judging'], string>> = {
  judged: '',
  stopped: 'stopped',
  blind: 'blind',
  'not-judged': 'not judged',
  'no-limit': 'no limit',
  'out-of-service': 'out of service',
};

function tableBlocks(facts: SummaryFacts, mostRows: number): Block[] {
  const blocks: Block[] = [];
  let left = mostRows;
  let hidden = 0;
  for (const points of gather(facts.points, ({ machine }) => machine.id)) {
    const rows = points.flatMap((point) => pointRows(point, facts.site.timeZone));
    const shown = rows.slice(0, Math.max(0, left));
    left -= shown.length;
    hidden += rows.length - shown.length;
    if (shown.length === 0) continue;
    blocks.push({ kind: 'heading', text: machineHeading(points) });
    blocks.push({ kind: 'table', heads: tableHeads, rows: shown });
  }
  if (hidden > 0) {
    blocks.push({
      kind: 'paragraph',
      text: `And ${counted(hidden, 'row')} more in data/summary/latest.html.`,
    });
  }
  return blocks;
}

function machineHeading(points: readonly PointNow[]): string {
  const { machine } = points[0] as PointNow;
  const worst = machineZoneNow(points);
  const zone =
    worst === null ? '' : `, zone ${worst.letter} of ${foreign(worst.table)}: ${nameOf(worst.point)}`;
  return `${nameOf(machine)} (criticality ${machine.criticality})${zone}`;
}

const tableHeads = ['Point, band', 'Level (interval)', 'Of alert', 'Of danger', 'Change', 'Last'];

function pointRows({ point, judging, lastMs, bands }: PointNow, timeZone: string): Said[][] {
  const last = lastMs === null ? 'never' : shortMomentText(lastMs, timeZone);
  const word = judgingWord[judging];
  const note = word === '' ? '' : ` (${word})`;
  if (bands.length === 0) return [[`${nameOf(point)}${note}`, 'no band', '', '', '', last]];
  return bands.map((now) => {
    // A machine that stands shows the level of when it last ran, which 'last' would belie.
    const older = now.level !== null && lastMs !== null && now.level.usedMs < lastMs;
    const from = older ? `, of ${shortMomentText(now.level.usedMs, timeZone)}` : '';
    return [`${nameOf(point)}${note}, ${idText(now.band.id)}`, ...bandCells(now, from), last];
  });
}

/** `from`: when the level was measured, where that must be said. */
function bandCells({ band, level, limits, change, zone }: BandNow, from: string): Said[] {
  if (level === null) return ['no level', '', '', ''];
  const { display } = band;
  const interval = `(${bareLevel(level.intervalLow, display)} to ${bareLevel(level.intervalHigh, display)})`;
  const value = `${level.atLeast ? 'at least ' : ''}${bareLevel(level.level, display)} ${unitText(display)}`;
  const shares = (['alert', 'danger'] as const).map((severity) => {
    const used = limits
      .filter((limit) => limit[severity] !== null)
      .map((limit) => shareOfAlert(level.level, { ...limit, alert: limit[severity] }) ?? 0);
    if (used.length > 0) return percentText(Math.max(...used));
    return limits.some(({ unknown }) => unknown !== undefined) ? 'not reckoned' : 'none';
  });
  const changed = change === null ? '' : `${changeText(change.ratio)}${change.worse ? ', worse' : ''}`;
  const said = `${value} ${interval}`;
  if (zone === null || zone.letter === null) return [`${said}${from}`, ...shares, changed];
  const before = `${said}, ${zone.atLeast ? 'at least ' : ''}zone `;
  return [{ before, zone: zone.letter, after: from }, ...shares, changed];
}
