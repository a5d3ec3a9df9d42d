import { plain } from '../../advisory/escape.ts';
import { counted } from '../../advisory/level-words.ts';
import { lineWidth, listing, wrapText } from '../output.ts';
import { averagingText, machineText, showsOf } from './machine-text.ts';
import { cannotTexts } from './recording-advice.ts';
import { outermost } from './retired.ts';
import type { SiteCheck } from './site-check.ts';

/** More advice than that at once is not followed; all of it stands in --json. */
const mostAdvice = 10;

/** What a site file means, for people: machine by machine, then what to know, last one line. */
export function checkText(check: SiteCheck): string {
  const { site } = check;
  const elsewhere = sharedFacts(check).length > 0;
  const machines = site.machines.map((machine) =>
    machineText(
      machine,
      check.points.filter(({ point }) => point.machineId === machine.id),
      { timeZone: site.timeZone, averagingElsewhere: elsewhere },
    ),
  );
  return [
    `${plain(site.name)}, ${plain(site.file)}\n`,
    ...machines,
    ...siteTexts(check),
    lastLine(check),
  ].join('\n');
}

/** How recordings are averaged and what they show, where that holds for all points alike. */
function sharedFacts({ points }: SiteCheck): [string, string][] {
  const only = (texts: readonly string[]) => (new Set(texts).size === 1 ? (texts[0] ?? null) : null);
  const averaging = only(points.map(averagingText));
  const shows = only(points.map(showsOf));
  if (averaging === null || shows === null) return [];
  return [
    ['Averaging', `all points: ${averaging}`],
    ...(shows === '' ? [] : [['Shows', shows] as [string, string]]),
  ];
}

/** What holds for the whole site. */
function siteFacts(check: SiteCheck): [string, string][] {
  const { site, firstTime } = check;
  return [
    ...sharedFacts(check),
    ['Mail', mailText(site)],
    ['Summary', summaryText(site)],
    ...(firstTime
      ? [['Ledger', 'none yet; the service makes it when it first starts'] as [string, string]]
      : []),
  ];
}

function siteTexts(check: SiteCheck): string[] {
  const { site, drop, retired, remarks } = check;
  const texts: string[] = [];
  const told = (title: string, lines: readonly string[]) => {
    if (lines.length === 0) return;
    texts.push(`${title}\n${lines.map((text) => bullet(text)).join('')}`);
  };
  // That there is no mail stands below, at the end where it is not overlooked.
  const warnings = site.warnings.filter(({ text }) => site.mail !== null || !text.startsWith('without mail'));
  told('Warnings', [...remarks, ...warnings.map(({ line, text }) => `line ${line}: ${text}`)]);
  const cannot = cannotTexts(check.points);
  told('What recordings cannot show (humledger recording-plan --point MACHINE/POINT says more)', [
    ...cannot.slice(0, mostAdvice),
    ...(cannot.length > mostAdvice ? [`and ${cannot.length - mostAdvice} more`] : []),
  ]);
  const strangers = drop.unassigned.slice(0, 5);
  const more = drop.unassigned.length - strangers.length;
  told('Files in the drop folder that no point takes (humledger files says why)', [
    ...strangers,
    ...(more > 0 ? [`and ${more} more`] : []),
  ]);
  const gone = outermost(retired);
  const closed =
    retired.alarms.length === 0 ? [] : [`and would close what stands: ${retired.alarms.join(', ')}`];
  told('The ledger would retire, with its series', [
    ...gone.slice(0, 20),
    ...(gone.length > 20 ? [`and ${gone.length - 20} more`] : []),
    ...closed,
    ...(gone.length === 0 ? [] : ['after a renaming, keep it by formerly: [old-id] in the site file']),
  ]);
  texts.push(listing(siteFacts(check)));
  return texts;
}

function mailText({ mail }: SiteCheck['site']): string {
  if (mail === null) return 'none: nobody is told of an alarm';
  const { host, port, security, user } = mail.server;
  const login = user === null ? 'without login' : `as ${user}`;
  return `to ${mail.to.map(({ address }) => address).join(', ') || 'nobody'}; by ${host}:${port}, ${security === 'none' ? 'not encrypted' : security}, ${login}`;
}

function summaryText({ summary, mail, timeZone }: SiteCheck['site']): string {
  if (summary === null) return 'none';
  const { hour, minute } = summary.at;
  const at = `every day at ${String(hour).padStart(2, '0')}:${String(minute).padStart(2, '0')} (${timeZone})`;
  const to = mail === null ? [] : summary.to.map(({ address }) => address);
  return `${at}, ${to.length === 0 ? 'as a file in the data folder, mailed to nobody' : `to ${to.join(', ')}`}`;
}

function lastLine({ points, limits, notReckoned, recipients, hindrances, lacks }: SiteCheck): string {
  const missing = [...hindrances, ...lacks];
  const yet = notReckoned === 0 ? '' : ` (${notReckoned} not reckoned now)`;
  const counts = `${counted(points.length, 'point')}, ${counted(limits, 'limit')}${yet}, ${counted(recipients.length, 'recipient')}`;
  const [only] = missing;
  if (only === undefined) return `${counts}; ready to run\n`;
  const line = `${counts}; ${only}`;
  if (missing.length === 1 && line.length <= lineWidth) return `${plain(line)}\n`;
  const short = lacks.map((text) => text.replace(/:.*/, '')).join(', ');
  const verdict = hindrances.length > 0 ? 'not ready' : short;
  return `Missing\n${missing.map((text) => bullet(text)).join('')}\n${counts}; ${verdict}: see Missing\n`;
}

function bullet(text: string, mark = '- '): string {
  return wrapText(plain(text), lineWidth - 4)
    .map((part, n) => `  ${n === 0 ? mark : '  '}${part}\n`)
    .join('');
}
