import type { Mail } from '../advisory/facts.ts';
import { messageIdentity, priorityOf } from '../advisory/outbox.ts';
import { morningOf } from '../advisory/summary.ts';
import type { SummaryFacts } from '../advisory/summary-facts.ts';
import { summaryFile, summaryMail } from '../advisory/summary-mail.ts';
import { localDate } from '../config/local-time.ts';
import { troubleToldInSummary } from '../detection/trouble.ts';
import { alarmByNumber } from '../store/alarms.ts';
import { readJournal } from '../store/journal.ts';
import type { Writer } from '../store/lent-connection.ts';
import { insertMessage, type NewDelivery, supersedeOlder } from '../store/messages.ts';
import { saveAlarmChange } from '../store/save-alarm.ts';
import { keepSummary, lastSummary, readSummary } from '../store/summaries.ts';
import { ledgerBytes, noteLedgerSize } from './disk-room.ts';
import type { Draft } from './draft.ts';
import { type MailTools, wallMsOf } from './mail-tools.ts';
import { type PlainSummary, plainSummary } from './plain-summary.ts';
import { dailyDue } from './schedule.ts';
import type { SiteView } from './site-view.ts';
import { deliveriesFor } from './store-draft.ts';
import { hasSummaryFile, writeSummaryFiles } from './summary-files.ts';
import { gatherSummary, type SummaryQuestion } from './summary-gather.ts';

/** A summary as it is read: the mail, and the file with every row. */
export interface SummaryNow {
  readonly facts: SummaryFacts;
  readonly mail: Mail;
  readonly html: string;
}

/** What the summary would say now. Nothing is stored, nothing sent, nothing counts as told. */
export async function summaryNow(question: SummaryQuestion): Promise<SummaryNow> {
  const facts = await gatherSummary(question);
  return { facts, mail: summaryMail(facts), html: summaryFile(facts) };
}

/**
 * Once a local date, when its time has come: the summary is gathered, stored with its mail in one transaction, and then
 * written to the data folder. Returns the date, or null where nothing is due.
 */
export async function morning(tools: MailTools): Promise<string | null> {
  const { ledger, clock } = tools;
  const view = tools.view();
  const { summary, timeZone, folders } = view.site;
  if (summary === null) return null;
  const nowMs = wallMsOf(clock);
  const { last, sinceMs } = await ledger.read(async (reader) => ({
    last: await lastSummary(reader, localDate(nowMs, timeZone)),
    // The journal begins with the first start: what had passed by then is not made up for.
    sinceMs: (await readJournal(reader, { afterSequence: 0, limit: 1 }))[0]?.wallMs ?? nowMs,
  }));
  const lastDone = last?.localDate ?? null;
  const date = dailyDue({ wallMs: nowMs, timeZone, at: summary.at, lastDone, sinceMs });
  if (date === null) {
    // A stop between the commit and the files leaves the mail's HTML, which has all but the longest tables.
    if (last !== null && last.html !== '' && !hasSummaryFile(folders.data, last.localDate)) {
      writeFiles(tools, view, last.localDate, last.html);
    }
    return null;
  }
  const question = { ledger, view, nowMs, upSinceMs: tools.startedMs };
  const made = await summaryOrPlain(tools, view, question, date);
  if (made === null) return null;
  tools.step('summary: stored');
  tools.log.info({ date, subject: made.mail.subject }, 'summary written');
  writeFiles(tools, view, date, made.html);
  return date;
}

/** Makes and stores it; null where the date has one already. One that cannot be made or stored is a plain list. */
async function summaryOrPlain(
  tools: MailTools,
  view: SiteView,
  question: SummaryQuestion,
  date: string,
): Promise<SummaryNow | PlainSummary | null> {
  const { nowMs } = question;
  try {
    const now = await summaryNow(question);
    return (await store(tools, view, date, now, nowMs)) ? now : null;
  } catch (error) {
    const plain = await plainSummary(tools, view, error);
    return (await store(tools, view, date, plain, nowMs)) ? plain : null;
  }
}

async function store(
  tools: MailTools,
  view: SiteView,
  date: string,
  now: SummaryNow | PlainSummary,
  nowMs: number,
): Promise<boolean> {
  const { ledger } = tools;
  const { mail, summary } = view.site;
  const addresses = new Set((mail === null ? [] : (summary?.to ?? [])).map(({ address }) => address));
  const draft: Draft = {
    kind: 'summary',
    identity: messageIdentity(ledger.id, 'summary', [date]),
    priority: priorityOf('summary', null),
    groupKey: 'summary',
    subject: now.mail.subject,
    tells: [],
    mails: [...addresses].map((recipient) => ({ recipient, mail: now.mail, earlier: [] })),
    thread: null,
  };
  const deliveries = mail === null ? [] : await deliveriesFor(draft, mail.from, nowMs);
  const { facts } = now;
  const bytes = ledgerBytes(ledger);
  return ledger.transact(async (writer) => {
    if ((await readSummary(writer, date)) !== null) return false;
    const messageId = mail === null ? null : await keepMessage(writer, draft, deliveries, nowMs);
    await keepSummary(writer, {
      localDate: date,
      createdMs: nowMs,
      messageId,
      html: now.mail.html,
      facts: JSON.stringify(facts === null ? null : morningOf(facts)),
    });
    if (facts !== null) await acknowledgeTold(writer, view, facts, nowMs);
    await noteLedgerSize(writer, { ms: nowMs, bytes });
    return true;
  });
}

async function keepMessage(
  writer: Writer,
  draft: Draft,
  deliveries: readonly NewDelivery[],
  nowMs: number,
): Promise<number> {
  const { kind, identity, priority, groupKey, subject } = draft;
  const message = { kind, identity, priority, groupKey, subject, deliveries, threadId: null, tells: [] };
  const { id } = await insertMessage(writer, { ...message, createdMs: nowMs, notBeforeMs: 0 });
  await supersedeOlder(writer, 'summary', id);
  return id;
}

/** Troubles that had returned when the summary was gathered, and still have, need no hand any more. */
async function acknowledgeTold(
  writer: Writer,
  view: SiteView,
  facts: SummaryFacts,
  wallMs: number,
): Promise<void> {
  for (const { kind, number, standing } of facts.standing) {
    if (kind !== 'trouble' || standing !== 'returned-unacknowledged') continue;
    const alarm = (await alarmByNumber(writer, number))?.alarm;
    if (alarm === undefined || alarm.number !== number || alarm.subject.kind !== 'trouble') continue;
    const change = troubleToldInSummary(alarm.subject, alarm.state);
    if (change === null) continue;
    await saveAlarmChange(writer, change, {
      ids: view.ids,
      wallMs,
      recordingId: null,
      actor: 'service',
      via: 'service',
      fromBacklog: false,
    });
  }
}

/** The summary is in the ledger and on its way; a folder that cannot be written is said, not fatal. */
function writeFiles(tools: MailTools, view: SiteView, date: string, html: string): void {
  try {
    writeSummaryFiles(view.site.folders.data, date, html);
  } catch (error) {
    tools.complaints.say(
      'summary-file',
      `the summary cannot be written to the data folder: ${(error as Error).message}`,
    );
  }
}
