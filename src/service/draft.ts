import { alarmMail, mailSeverity, numberOfSubject } from '../advisory/alarm-mail.ts';
import type { AlarmFacts, AlarmMailFacts, Mail, TroubleFacts } from '../advisory/facts.ts';
import { catchUpMail } from '../advisory/notices.ts';
import { isWorse, messageIdentity, priorityOf, worseSeverity } from '../advisory/outbox.ts';
import type { RecipientNow } from '../advisory/recipients.ts';
import type { MailSettings, Severity } from '../config/site.ts';
import { alarmByNumber } from '../store/alarms.ts';
import type { Reader } from '../store/lent-connection.ts';
import type { MessageKind, UntoldEvent } from '../store/messages.ts';
import { stoodAt } from '../store/thread-ends.ts';
import { mailIdsOfThread, openThreadOf, subjectsOfThread, type Thread } from '../store/threads.ts';
import { alarmCharts } from './alarm-charts.ts';
import { alarmFacts } from './alarm-facts.ts';
import { addressesFor, catchUpFacts, passedFor } from './catch-up.ts';
import { machineFacts, machineOfId, siteFacts } from './fact-names.ts';
import type { SiteView } from './site-view.ts';
import { toldAgain } from './told-again.ts';
import { troubleFacts } from './trouble-facts.ts';

/** A message as it will be stored, but for its bytes; made inside one reading of the ledger. */
export interface Draft {
  readonly kind: MessageKind;
  readonly identity: string;
  readonly priority: number;
  readonly groupKey: string;
  readonly subject: string;
  /** Events (UntoldEvent.id) that it tells. */
  readonly tells: readonly number[];
  readonly mails: readonly MailTo[];
  readonly thread: DraftThread | null;
}

export interface MailTo {
  readonly recipient: string;
  readonly mail: Mail;
  /** Message-IDs that this recipient got in the thread before, oldest first. */
  readonly earlier: readonly string[];
}

export interface DraftThread {
  readonly machineId: number | null;
  /** The thread that was open when the draft was made; storing it checks that this still holds. */
  readonly open: Thread | null;
  /** False: the one that is open is over, a new one begins. */
  readonly goesOn: boolean;
  readonly severity: Severity;
}

export interface DraftFrom {
  readonly view: SiteView;
  readonly mail: MailSettings;
  /** Of alarm mails, at this moment. */
  readonly recipients: readonly RecipientNow[];
  readonly ledgerId: string;
  readonly nowMs: number;
}

/** The mail of one machine's gathered events (machine null: of logger, files and service). */
export async function draftAlarmMail(
  reader: Reader,
  from: DraftFrom,
  machineId: number | null,
  events: readonly UntoldEvent[],
): Promise<Draft> {
  const { view, nowMs } = from;
  const facts = await alarmMailFacts(reader, view, machineId, events, nowMs);
  const severity = mailSeverity(facts) ?? 'trouble';
  const open = await openThreadOf(reader, machineId);
  const goesOn = open !== null && (await threadGoesOn(reader, machineId, events));
  const threadSubject =
    goesOn && open !== null ? await subjectBefore(reader, open.id, facts, severity) : null;
  const mail = alarmMail({ ...facts, threadSubject });
  const mails: MailTo[] = [];
  const next = [...facts.alarms, ...facts.troubles].flatMap(({ reminder }) => reminder?.thenTo ?? []);
  const addresses = [...addressesFor(view, from.recipients, machineId, events), ...next];
  for (const recipient of new Set(addresses)) {
    const earlier = goesOn && open !== null ? await mailIdsOfThread(reader, open.id, recipient, 500) : [];
    mails.push({ recipient, mail, earlier });
  }
  return {
    kind: 'alarm',
    identity: identityOf(from, 'alarm', events),
    priority: priorityOf('alarm', worstOf(events)),
    groupKey: facts.machine?.id ?? 'site',
    subject: mail.subject,
    tells: events.map(({ id }) => id),
    mails,
    thread: { machineId, open, goesOn, severity },
  };
}

/** Mails of a thread in which an earlier subject is looked for. */
const subjectsLookedAt = 200;

/**
 * The subject under which the thread told one of these alarms before. An alarm keeps its subject through its life, until its
 * severity rises; another alarm of the same machine stands in the same thread under a subject of its own, or nobody would
 * see in an inbox that something new has come.
 */
async function subjectBefore(
  reader: Reader,
  threadId: number,
  facts: AlarmMailFacts,
  severity: Severity,
): Promise<string | null> {
  const numbers = new Set([...facts.alarms, ...facts.troubles].map(({ number }) => number));
  for (const subject of await subjectsOfThread(reader, threadId, subjectsLookedAt)) {
    const told = numberOfSubject(subject);
    if (told === null || !numbers.has(told.number)) continue;
    return isWorse(severity, told.severity) ? null : subject;
  }
  return null;
}

export async function alarmMailFacts(
  reader: Reader,
  view: SiteView,
  machineId: number | null,
  events: readonly UntoldEvent[],
  nowMs: number,
): Promise<AlarmMailFacts> {
  const alarms: AlarmFacts[] = [];
  const troubles: TroubleFacts[] = [];
  for (const event of newestOfEach(events)) {
    if (event.key?.startsWith('limit:')) {
      const alarm = await alarmFacts(reader, view, event);
      const charts = await alarmCharts(reader, view, alarm, alarms.length);
      alarms.push({ ...alarm, charts, ...(await toldAgain(reader, event)) });
    } else {
      const life = event.number === null ? null : await alarmByNumber(reader, event.number);
      if (life?.alarm.subject.kind === 'trouble')
        troubles.push({
          ...(await troubleFacts(reader, view, life, event.event)),
          ...(await toldAgain(reader, event)),
        });
    }
  }
  const machine = machineId === null ? undefined : machineOfId(view, machineId);
  return {
    site: siteFacts(view),
    machine: machine === undefined ? null : machineFacts(view, machine.id),
    writtenMs: nowMs,
    alarms,
    troubles,
    threadSubject: null,
    test: false,
  };
}

/** What happened to one alarm within the gathering time is told by its newest event; of late levels by the highest. */
function newestOfEach(events: readonly UntoldEvent[]): UntoldEvent[] {
  const chosen = new Map<string, UntoldEvent>();
  for (const event of events) {
    const about = `${event.key} ${event.number}`;
    const before = chosen.get(about);
    const lower =
      event.event === 'exceeded-came-late' &&
      before !== undefined &&
      (event.level ?? 0) < (before.level ?? 0);
    if (!lower) chosen.set(about, event);
  }
  return [...chosen.values()];
}

/** It does unless everything it was about had ended before the first of these events began something new. */
async function threadGoesOn(
  reader: Reader,
  machineId: number | null,
  events: readonly UntoldEvent[],
): Promise<boolean> {
  const [first] = events;
  if (first === undefined || first.event !== 'raised' || first.number === null) return true;
  return stoodAt(reader, machineId, { beforeNumber: first.number, wallMs: first.wallMs });
}

/** What came and went, in one mail; null where nobody takes any of it. Stands in no thread. */
export async function draftCatchUp(
  reader: Reader,
  from: DraftFrom,
  events: readonly UntoldEvent[],
): Promise<Draft> {
  const { view, recipients, nowMs } = from;
  const facts = await catchUpFacts(reader, view, events, nowMs);
  const mails = [...passedFor(view, recipients, facts.passed)].map(([recipient, passed]) => ({
    recipient,
    mail: catchUpMail({ ...facts, passed }),
    earlier: [],
  }));
  return {
    kind: 'catch-up',
    identity: identityOf(from, 'catch-up', events),
    priority: priorityOf('catch-up', null),
    groupKey: 'catch-up',
    subject: catchUpMail(facts).subject,
    tells: events.map(({ id }) => id),
    mails,
    thread: null,
  };
}

/** Named by its events alone, in whatever order they were read. */
export function identityOf({ ledgerId }: DraftFrom, kind: string, events: readonly UntoldEvent[]): string {
  return messageIdentity(ledgerId, kind, events.map(({ identity }) => identity).sort());
}

export function worstOf(events: readonly UntoldEvent[]): Severity {
  return events.map(({ severity }) => severity).reduce(worseSeverity, 'trouble');
}
