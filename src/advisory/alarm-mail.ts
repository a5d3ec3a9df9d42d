import type { Severity } from '../config/site.ts';
import { alarmDetails, type Detail } from './alarm-details.ts';
import { alarmPictures } from './alarm-pictures.ts';
import { clip, plain } from './escape.ts';
import type { AlarmFacts, AlarmMailFacts, MachineFacts, Mail, StandingFacts, TroubleFacts } from './facts.ts';
import type { Block, Letter } from './letter.ts';
import { markWord } from './letter.ts';
import { letterHtml } from './letter-html.ts';
import { letterText } from './letter-text.ts';
import { counted, measuredText } from './level-words.ts';
import { byUrgency, type Ranked, shareOfAlert } from './ranking.ts';
import { durationText, momentText } from './time-words.ts';
import {
  acknowledgeCommand,
  caution,
  eventText,
  foreign,
  idText,
  isReturned,
  nameOf,
  placeText,
  standingText,
  troubleAdvice,
  troubleName,
  zoneText,
} from './wording.ts';

/** Longest subject: what mail programs and phones still show in part, and well under a header line's 998 octets. */
export const longestSubject = 150;

/** One mail for what happened to one machine within the gathering time: what to do first, the worst first. */
export function alarmMail(facts: AlarmMailFacts): Mail {
  const subject = facts.threadSubject === null ? alarmSubject(facts) : subjectLine(facts.threadSubject);
  const letter = alarmLetter(facts);
  const pictures = inOrder(facts).flatMap((item, place) =>
    alarmPictures(item, place).map(({ picture }) => picture),
  );
  return { subject, text: letterText(letter), html: letterHtml(letter), pictures };
}

/**
 * Subject for the first mail of a thread and after a rise in severity: severity, number, machine, point, band, level
 * of the worst. Later mails of the thread keep the stored one.
 */
export function alarmSubject(facts: AlarmMailFacts): string {
  const items = inOrder(facts);
  const first = items[0];
  if (first === undefined)
    return subjectLine(`${facts.test ? 'TEST: ' : ''}${nameOf(facts.site)}: nothing to tell`);
  const word = markWord[severityOf(first)];
  const mark = facts.test ? `TEST: ${word}` : first.number === 0 ? word : `${word} ${first.number}`;
  const others = items.length > 1 ? ` (and ${items.length - 1} more)` : '';
  // The names give way, so that what stands behind them stays: level and number of others.
  const names = [first.machine, first.point].filter((named) => named !== null);
  const where =
    names.length === 0
      ? clip(whereText(first as TroubleFacts), 60)
      : names.map((named) => clip(nameOf(named), 36)).join(', ');
  const what =
    first.kind === 'alarm'
      ? `, ${clip(first.band.id, 20)} ${measuredText(first.level, first.band.display)}`
      : `: ${troubleName[first.trouble]}`;
  return subjectLine(`${mark}: ${where}${what}${others}`);
}

/** The alarm or trouble that a subject of `alarmSubject` names, and how grave it was then; null where it names none. */
export function numberOfSubject(
  subject: string,
): { readonly severity: Severity; readonly number: number } | null {
  const severity = (['danger', 'alert', 'trouble'] as const).find((one) =>
    subject.startsWith(`${markWord[one]} `),
  );
  const number =
    severity === undefined ? Number.NaN : Number.parseInt(subject.slice(markWord[severity].length), 10);
  return severity === undefined || Number.isNaN(number) ? null : { severity, number };
}

/** The worst severity in a mail: what the thread is stored with, and what decides its haste. Null in an empty one. */
export function mailSeverity(facts: Pick<AlarmMailFacts, 'alarms' | 'troubles'>): Severity | null {
  const severities = [...facts.alarms, ...facts.troubles].map(severityOf);
  return (['danger', 'alert', 'trouble'] as const).find((severity) => severities.includes(severity)) ?? null;
}

/** One header line: harmless, single spaces, at most 150 characters. */
export function subjectLine(text: string): string {
  return clip(plain(text).replace(/ {2,}/g, ' ').trim(), longestSubject);
}

export type Item = AlarmFacts | TroubleFacts;

export function severityOf(item: Item): Severity {
  return item.kind === 'alarm' ? item.severity : 'trouble';
}

function inOrder(facts: AlarmMailFacts): Item[] {
  const ranked = (item: Item): Ranked => ({
    machine: null,
    severity: severityOf(item),
    share: item.kind === 'alarm' ? shareOfAlert(item.level.level, item.limit) : null,
  });
  return [...facts.alarms, ...facts.troubles].sort(
    (a, b) => Number(isOver(a)) - Number(isOver(b)) || byUrgency(ranked(a), ranked(b)) || a.number - b.number,
  );
}

/** What is over needs nobody and stands last. A level that came late, and a removed limit, never stand and are news. */
export function isOver(item: Item): boolean {
  if (item.event === 'exceeded-came-late' || item.event === 'limit-removed') return false;
  return item.event === 'returned' || item.standing === 'normal';
}

export function alarmLetter(facts: AlarmMailFacts): Letter {
  const items = inOrder(facts);
  const { timeZone } = facts.site;
  const blocks: Block[] = [];
  const first = items[0];
  const lead =
    first === undefined
      ? 'Nothing to do.'
      : `${remindText(first)}${whatToDo(first)}${respondText(first, facts)}`;
  if (items.length > 1) {
    blocks.push(...items.map((item) => findingOf(item, timeZone, facts.test)), {
      kind: 'heading',
      text: 'Each by itself',
    });
  }
  items.forEach((item, index) => {
    blocks.push(findingOf(item, timeZone, facts.test));
    const details: Detail[] =
      item.kind === 'alarm'
        ? alarmDetails(item, timeZone, facts.writtenMs)
        : troubleDetails(item, timeZone, facts.writtenMs);
    const todo: Detail[] = index === 0 ? [] : [['To do', `${whatToDo(item)}${respondText(item, facts)}`]];
    const rows = [...todo, ...details].filter(([name]) => !(facts.test && name === 'State'));
    blocks.push({ kind: 'pairs', rows });
    blocks.push(...alarmPictures(item, index).map(({ block }) => block));
    if (!facts.test && needsAcknowledging(item)) {
      blocks.push({ kind: 'command', text: acknowledgeCommand(item.number) });
    }
  });
  if (facts.test)
    blocks.push({ kind: 'paragraph', text: 'There is nothing to acknowledge: no alarm was raised.' });
  blocks.push({ kind: 'closing', text: `${zoneText(timeZone)} Commands are typed where the service runs.` });
  blocks.push({ kind: 'closing', text: caution });
  return {
    lead,
    head: `${nameOf(facts.site)}, ${momentText(facts.writtenMs, timeZone)}`,
    test: facts.test,
    blocks,
  };
}

export function findingOf(item: Item, timeZone: string, test = false): Extract<Block, { kind: 'finding' }> {
  const happened = happenedText(item, timeZone);
  return {
    kind: 'finding',
    mark: severityOf(item),
    number: test || item.number === 0 ? null : item.number,
    text:
      item.kind === 'alarm'
        ? `${placeText(item.machine, item.point)}: ${idText(item.band.id)} ${measuredText(item.level, item.band.display)}`
        : `${whereText(item)}: ${troubleName[item.trouble]}`,
    more: happened === null ? [] : [happened],
  };
}

/** What this mail tells of it, where the severity alone does not say so. */
function happenedText(item: Item, timeZone: string): string | null {
  const { reminder } = item;
  if (reminder !== undefined) {
    const told = momentText(reminder.toldMs, timeZone);
    const also =
      reminder.thenTo.length === 0 ? '' : ` Now told as well: ${reminder.thenTo.map(foreign).join(', ')}.`;
    return `Reminder ${reminder.number}: told ${told}, and nobody has acknowledged it.${also}`;
  }
  if (item.kind === 'alarm' && item.wasAcknowledged !== undefined) {
    const { by, ms } = item.wasAcknowledged;
    return `Told again: ${foreign(by)} acknowledged it ${momentText(ms, timeZone)}, and it still stands.`;
  }
  return eventText(item.event);
}

function remindText(item: Item): string {
  return item.reminder === undefined ? '' : 'Nobody has acknowledged this yet. ';
}

/** Where a trouble is: machine and point, or the logger's files, or the site as a whole. */
export function whereText(trouble: TroubleFacts): string {
  if (trouble.machine !== null) return placeText(trouble.machine, trouble.point);
  return trouble.source === null ? 'The service' : `Logger files ${foreign(trouble.source)}`;
}

/** The sentence that a mail begins with. */
export function whatToDo(item: Item): string {
  if (isOver(item)) {
    return needsAcknowledging(item)
      ? 'This is over: find out what it was, then acknowledge.'
      : 'Nothing to do: this is over.';
  }
  if (item.kind === 'trouble') return troubleAdvice[item.trouble];
  if (item.event === 'limit-removed')
    return 'Look at this machine before the alarm is forgotten: its limit is gone.';
  return actionText(item.action, item.machine);
}

export function actionText(action: string | null, machine: MachineFacts): string {
  const said = action === null ? '' : foreign(action).trim();
  if (said === '')
    return `Have somebody qualified look at ${nameOf(machine)}; the site file names no action.`;
  return /[.!?…]$/.test(said) ? said : `${said}.`;
}

export function respondText(
  item: Item,
  { writtenMs, site }: Pick<AlarmMailFacts, 'writtenMs' | 'site'>,
): string {
  return item.respondByMs === null || isOver(item)
    ? ''
    : ` ${respondByText(item.respondByMs, writtenMs, site.timeZone)}`;
}

export function respondByText(respondByMs: number, nowMs: number, timeZone: string): string {
  const at = momentText(respondByMs, timeZone);
  const left = durationText(respondByMs - nowMs);
  return respondByMs >= nowMs
    ? `Respond by ${at} (in ${left}).`
    : `The time to respond ended ${at}, ${left} ago.`;
}

export function needsAcknowledging(facts: StandingFacts): boolean {
  return facts.standing === 'unacknowledged' || isReturned(facts);
}

function troubleDetails(trouble: TroubleFacts, timeZone: string, writtenMs: number): Detail[] {
  const rows: Detail[] = [];
  if (trouble.detail !== null) rows.push(['Found', foreign(trouble.detail)]);
  const files = trouble.recordings > 0 ? `, ${counted(trouble.recordings, 'recording')}` : '';
  const since = `${momentText(trouble.sinceMs, timeZone)} (${durationText(writtenMs - trouble.sinceMs)})`;
  rows.push(['Since', `${since}${files}`]);
  const every =
    trouble.expectedEveryMs === null ? '' : `; expected every ${durationText(trouble.expectedEveryMs)}`;
  if (trouble.lastGoodMs !== null) {
    rows.push(['Last good', `${momentText(trouble.lastGoodMs, timeZone)}${every}`]);
  } else if (trouble.trouble === 'overdue') {
    rows.push(['Last good', `nothing ever came${every}`]);
  }
  rows.push(['State', standingText(trouble, timeZone)]);
  return rows;
}
