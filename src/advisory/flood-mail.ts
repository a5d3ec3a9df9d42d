import { alarmDetails } from './alarm-details.ts';
import {
  findingOf,
  type Item,
  isOver,
  needsAcknowledging,
  respondText,
  severityOf,
  subjectLine,
  whatToDo,
} from './alarm-mail.ts';
import { clip } from './escape.ts';
import type { AlarmFacts, Mail, SiteFacts, TroubleFacts } from './facts.ts';
import { type Block, type Letter, markWord } from './letter.ts';
import { letterHtml } from './letter-html.ts';
import { letterText } from './letter-text.ts';
import { bareLevel, counted, measuredText } from './level-words.ts';
import { byUrgency, firstLimit, shareOfAlert } from './ranking.ts';
import { clockText, durationText, momentText } from './time-words.ts';
import { acknowledgeCommand, caution, foreign, nameOf, troubleName, zoneText } from './wording.ts';

/** What one mail of a flood is made from; conventions as in facts.ts. */
export interface FloodFacts {
  readonly site: SiteFacts;
  readonly writtenMs: number;
  /** When the first of its alarms came. */
  readonly fromMs: number;
  /** Null: it goes on. */
  readonly endedMs: number | null;
  /** Alarms and troubles that came in all of it until now; several events of one count once. */
  readonly alarmsInAll: number;
  /** A mail of this flood went to this recipient before. */
  readonly goesOn: boolean;
  /** What no mail has told yet. */
  readonly alarms: readonly AlarmFacts[];
  readonly troubles: readonly TroubleFacts[];
}

const mostInFull = 5;

/** One mail for what came in a flood: danger first, then by criticality and share of the limit; what is over stands last. */
export function floodMail(facts: FloodFacts): Mail {
  const items = inOrder(facts);
  const letter = floodLetter(facts, items);
  return { subject: floodSubject(facts, items), text: letterText(letter), html: letterHtml(letter) };
}

export function floodSubject(facts: FloodFacts, items: readonly Item[] = inOrder(facts)): string {
  const [first] = items;
  const over = facts.endedMs === null ? 'alarm flood' : 'alarm flood, over';
  if (first?.kind === 'alarm' && severityOf(first) === 'danger' && !isOver(first)) {
    const names = [first.machine, first.point].map((named) => clip(nameOf(named), 30)).join(', ');
    const more = items.length === 1 ? '' : ` and ${items.length - 1} more`;
    const what = `${clip(first.band.id, 20)} ${measuredText(first.level, first.band.display)}`;
    return subjectLine(`${markWord.danger} ${first.number}: ${names}, ${what}${more} (${over})`);
  }
  if (facts.endedMs !== null)
    return subjectLine(
      `${nameOf(facts.site)}: alarm flood is over, ${counted(facts.alarmsInAll, 'alarm')} in all`,
    );
  const since = facts.goesOn
    ? `, ${counted(items.length, 'alarm')} more`
    : `, ${counted(items.length, 'alarm')}`;
  return subjectLine(`${nameOf(facts.site)}: ${over}${since}`);
}

function inOrder({ alarms, troubles }: FloodFacts): Item[] {
  const dangerFirst = (item: Item) => Number(severityOf(item) !== 'danger');
  const ranked = (item: Item) => ({
    machine: item.machine,
    severity: severityOf(item),
    share: item.kind === 'alarm' ? shareOfAlert(item.level.level, item.limit) : null,
  });
  return [...alarms, ...troubles].sort(
    (a, b) =>
      Number(isOver(a)) - Number(isOver(b)) ||
      dangerFirst(a) - dangerFirst(b) ||
      byUrgency(ranked(a), ranked(b)) ||
      a.number - b.number,
  );
}

function floodLetter(facts: FloodFacts, items: readonly Item[]): Letter {
  const { timeZone } = facts.site;
  const dangers = items.filter(
    (item): item is AlarmFacts => item.kind === 'alarm' && severityOf(item) === 'danger' && !isOver(item),
  );
  const blocks: Block[] = [{ kind: 'paragraph', text: courseText(facts) }];
  if (items.length > 0) blocks.push({ kind: 'heading', text: countsText(items) });
  blocks.push(...items.map((item) => lineOf(item, facts)));
  if (items.some(needsAcknowledging)) {
    blocks.push({ kind: 'paragraph', text: 'Acknowledge each by its number:' });
    blocks.push({ kind: 'command', text: acknowledgeCommand('NUMBER') });
  }
  if (dangers.length > 0) blocks.push({ kind: 'heading', text: 'Danger in full' });
  for (const danger of dangers.slice(0, mostInFull)) {
    blocks.push({ ...findingOf(danger, timeZone), more: [] });
    blocks.push({ kind: 'pairs', rows: alarmDetails(danger, timeZone, facts.writtenMs) });
  }
  blocks.push({ kind: 'closing', text: `${zoneText(timeZone)} Commands are typed where the service runs.` });
  blocks.push({ kind: 'closing', text: caution });
  return {
    lead: leadText(facts, dangers[0], items),
    head: `${nameOf(facts.site)}, ${momentText(facts.writtenMs, timeZone)}`,
    test: false,
    blocks,
  };
}

function leadText(facts: FloodFacts, danger: AlarmFacts | undefined, items: readonly Item[]): string {
  if (danger !== undefined)
    return `Begin with danger ${danger.number}, ${nameOf(danger.machine)}: ${whatToDo(danger)}${respondText(danger, facts)}`;
  if (items.every(isOver)) {
    return facts.endedMs === null ? 'Nothing to do: what this tells is over.' : 'The alarm flood is over.';
  }
  const begin = 'Look for one cause first (power, network, logger, the process), then go down the list.';
  return facts.endedMs === null ? begin : `The alarm flood is over. ${begin}`;
}

function courseText({ site, fromMs, endedMs, alarmsInAll, goesOn }: FloodFacts): string {
  const from = momentText(fromMs, site.timeZone);
  const all = counted(alarmsInAll, 'alarm or trouble', 'alarms and troubles');
  if (endedMs !== null) {
    const span = `${from} to ${clockText(endedMs, site.timeZone)} (${durationText(endedMs - fromMs)})`;
    return `Flood of alarms, ${span}: ${all}. From now on each machine's are mailed by themselves again.`;
  }
  const since = goesOn ? `goes on since ${from}: ${all} so far` : `since ${from}: ${all}`;
  return (
    `Flood of alarms, ${since}. More than 10 came within 10 minutes, so they are told together: ` +
    'at once where there is danger, else once an hour and when the flood is over.'
  );
}

/** '1 danger, 12 trouble (9 dead sensor, 3 overdue)': a cause that they share shows in the kinds of trouble. */
function countsText(items: readonly Item[]): string {
  const open = items.filter((item) => !isOver(item));
  const of = (severity: string) => open.filter((item) => severityOf(item) === severity).length;
  const kinds = new Map<string, number>();
  for (const item of open) {
    if (item.kind === 'trouble')
      kinds.set(troubleName[item.trouble], (kinds.get(troubleName[item.trouble]) ?? 0) + 1);
  }
  const named = [...kinds].sort(([, a], [, b]) => b - a).map(([name, count]) => `${count} ${name}`);
  const said = [
    [of('danger'), 'danger'],
    [of('alert'), 'alert'],
    [of('trouble'), `trouble (${named.join(', ')})`],
    [items.length - open.length, 'over already'],
  ] as const;
  return said
    .filter(([count]) => count > 0)
    .map(([count, name]) => `${count} ${name}`)
    .join(', ');
}

/** One line, and below it what happened and what the site says is to be done. */
function lineOf(item: Item, facts: FloodFacts): Block {
  const { text, more, ...finding } = findingOf(item, facts.site.timeZone);
  if (item.kind === 'trouble')
    return { ...finding, text, more: item.detail === null ? more : [...more, foreign(item.detail)] };
  const at = item.limit[item.severity] ?? firstLimit(item.limit);
  const limit = at === null ? '' : ` (${item.severity} limit ${bareLevel(at, item.band.display)})`;
  const todo = isOver(item) || item.action === null ? [] : [`${whatToDo(item)}${respondText(item, facts)}`];
  return { ...finding, text: `${text}${limit}`, more: [...more, ...todo] };
}
