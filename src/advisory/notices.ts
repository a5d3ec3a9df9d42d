import { subjectLine } from './alarm-mail.ts';
import type { Mail, SiteFacts } from './facts.ts';
import type { Block, Letter } from './letter.ts';
import { letterHtml } from './letter-html.ts';
import { letterText } from './letter-text.ts';
import { counted, levelText } from './level-words.ts';
import type {
  CatchUpFacts,
  MessageFailedFacts,
  PassedAlarm,
  ServiceFacts,
  ServiceStartFacts,
  TestFacts,
} from './notice-facts.ts';
import { durationText, momentText } from './time-words.ts';
import { caution, foreign, idText, nameOf, placeText, troubleName, zoneText } from './wording.ts';

/** The rarer mails: what was missed meanwhile, word from the service itself, a test. */

/** One mail for all alarms that came and went while nothing could be evaluated or sent. */
export function catchUpMail(facts: CatchUpFacts): Mail {
  const { timeZone } = facts.site;
  const span = `${momentText(facts.fromMs, timeZone)} to ${momentText(facts.toMs, timeZone)}`;
  const standing = facts.passed.filter(({ endedMs }) => endedMs === null).length;
  const over = facts.passed.length - standing;
  const what = over === 0 ? 'no alarm came and went' : `${counted(over, 'alarm')} came and went`;
  const why =
    facts.reason === 'backlog'
      ? `${counted(facts.recordings, 'recording')} came together after a pause and were judged in their order.`
      : "This waited for the mail server, for somebody's hours or for the morning, and is over by now.";
  const still = standing === 0 ? '' : ` What still stands (${standing}) is mailed by itself.`;
  const lead = over === 0 ? `Nothing to do: ${what}.` : `Look at what happened meanwhile: ${what}.`;
  const blocks: Block[] = [
    { kind: 'paragraph', text: `${span} (${durationText(facts.toMs - facts.fromMs)}). ${why}${still}` },
    ...facts.passed.map((passed) => passedFinding(passed, timeZone)),
  ];
  return mailOf(facts, `catch-up: ${what}`, lead, blocks);
}

function passedFinding(passed: PassedAlarm, timeZone: string): Block {
  const where = passed.machine === null ? 'The service' : placeText(passed.machine, passed.point);
  const what: string[] = [];
  if (passed.trouble !== null) what.push(troubleName[passed.trouble]);
  if (passed.band !== null) {
    const highest =
      passed.highest === null ? '' : `, highest ${levelText(passed.highest, passed.band.display)}`;
    what.push(`${idText(passed.band.id)}${highest}`);
  }
  const ended =
    passed.endedMs === null
      ? 'still stands'
      : `over ${momentText(passed.endedMs, timeZone)}, after ${durationText(passed.endedMs - passed.beganMs)}`;
  return {
    kind: 'finding',
    mark: passed.severity,
    number: passed.number,
    text: what.length === 0 ? where : `${where}: ${what.join(', ')}`,
    more: [`From ${momentText(passed.beganMs, timeZone)}, ${ended}`],
  };
}

export function serviceMail(facts: ServiceFacts): Mail {
  return facts.kind === 'message-failed' ? messageFailedMail(facts) : startMail(facts);
}

function startMail(facts: ServiceStartFacts): Mail {
  const { timeZone } = facts.site;
  const rows: [string, string][] = [
    ['Started', momentText(facts.writtenMs, timeZone)],
    ...lastSeenRow(facts),
    [
      'Watches',
      `${counted(facts.machines, 'machine')}, ${counted(facts.points, 'point')}, ${counted(facts.limits, 'limit')}`,
    ],
    ['Drop folder', foreign(facts.dropFolder)],
    ['Mails go to', counted(facts.recipients, 'recipient')],
    ['Summary', facts.summaryAt === null ? 'none is sent' : `every day at ${foreign(facts.summaryAt)}`],
  ];
  const without = facts.pointsWithoutLimit;
  if (without.length > 0) {
    const rest = without.length > 8 ? `; and ${without.length - 8} more` : '';
    const named = without.slice(0, 8).map(foreign).join('; ');
    rows.push(['No limit', `${counted(without.length, 'point')} can never alarm: ${named}${rest}`]);
  }
  const blocks: Block[] = [{ kind: 'pairs', rows }];
  blocks.push(...olderLedger(facts));
  if (facts.kind === 'start-after-unclean-stop') {
    const text = 'Recordings that came meanwhile wait in the drop folder and are judged now, in their order.';
    blocks.push({ kind: 'paragraph', text });
  }
  if (facts.summaryAt !== null) {
    const text = 'A morning without a summary means that the service, or the way of its mail, is down.';
    blocks.push({ kind: 'paragraph', text });
  }
  const [subject, lead] = startWords[facts.kind];
  return mailOf(facts, subject, facts.lostActs.length > 0 ? doAgain : lead, blocks);
}

const startWords: Readonly<Record<ServiceStartFacts['kind'], readonly [subject: string, lead: string]>> = {
  'first-start': [
    'service started for the first time',
    'Nothing to do if these counts are what you expect: the service has started for the first time.',
  ],
  'start-after-unclean-stop': [
    'service started after an unclean stop',
    'Find out why the service stopped: it has started again after an unclean stop.',
  ],
  'start-with-older-ledger': [
    'service started with an older ledger',
    'Nothing to do if you put a backup of the ledger back: the service has started with it.',
  ],
};
const doAgain = 'Do again what is named below: the ledger was put back to a time before it.';
const mostActs = 50;

/** What the older ledger lacks. What people did is never done again for them. */
function olderLedger({ takenAgain, lostActs, site }: ServiceStartFacts): Block[] {
  const blocks: Block[] = [];
  if (takenAgain > 0) {
    const text = `${counted(takenAgain, 'recording')} of the archive came after this ledger was copied. They are taken again in their order: what came and went then is told in one mail, what still stands is mailed again.`;
    blocks.push({ kind: 'paragraph', text });
  }
  if (lostActs.length === 0) return blocks;
  const rows = lostActs
    .slice(0, mostActs)
    .map(({ wallMs, by, command }): [string, string] => [
      'Do again',
      `${foreign(command)}, by ${foreign(by)} (${momentText(wallMs, site.timeZone)})`,
    ]);
  const rest = lostActs.length - rows.length;
  if (rest > 0) rows.push(['', `and ${rest} more, in acts.log of the data folder`]);
  return [...blocks, { kind: 'pairs', rows }];
}

function lastSeenRow({ lastSeenMs, writtenMs, site }: ServiceStartFacts): [string, string][] {
  if (lastSeenMs === null) return [];
  const away = durationText(writtenMs - lastSeenMs);
  return [['Last seen', `${momentText(lastSeenMs, site.timeZone)}, ${away} before`]];
}

function messageFailedMail(facts: MessageFailedFacts): Mail {
  const lead =
    'Check this address and the mail server: a message was refused for good and will not be tried again.';
  const blocks: Block[] = [
    {
      kind: 'pairs',
      rows: [
        ['Message', foreign(facts.subject)],
        ['To', foreign(facts.recipient)],
        ['Answer', foreign(facts.answer)],
        ['Tried', momentText(facts.triedMs, facts.site.timeZone)],
      ],
    },
    { kind: 'paragraph', text: 'The alarm itself stands in the ledger and in the next summary.' },
  ];
  return mailOf(facts, `a message to ${foreign(facts.recipient)} was refused`, lead, blocks);
}

/** `check --mail`. */
export function testMail(facts: TestFacts): Mail {
  const lead = 'Nothing to do: if you read this, alarm mails will reach you.';
  const blocks: Block[] = [
    {
      kind: 'pairs',
      rows: [
        ['From', foreign(facts.from)],
        ['To', facts.to.map(foreign).join(', ')],
        ['Server', foreign(facts.server)],
        ['Site', `${counted(facts.points, 'point')}, ${counted(facts.limits, 'limit')}`],
      ],
    },
  ];
  return mailOf(facts, 'test message', lead, blocks, true);
}

interface Written {
  readonly site: SiteFacts;
  readonly writtenMs: number;
}

function mailOf(
  { site, writtenMs }: Written,
  subject: string,
  lead: string,
  blocks: Block[],
  test = false,
): Mail {
  const letter: Letter = {
    lead,
    head: `${nameOf(site)}, ${momentText(writtenMs, site.timeZone)}`,
    test,
    blocks: [
      ...blocks,
      { kind: 'closing', text: zoneText(site.timeZone) },
      { kind: 'closing', text: caution },
    ],
  };
  return {
    subject: subjectLine(`${test ? 'TEST: ' : ''}${nameOf(site)}: ${subject}`),
    text: letterText(letter),
    html: letterHtml(letter),
  };
}
