import type { ServiceStartFacts } from '../advisory/notice-facts.ts';
import { serviceMail } from '../advisory/notices.ts';
import { messageIdentity, priorityOf } from '../advisory/outbox.ts';
import { reachOf, recipientsAt } from '../advisory/recipients.ts';
import { pointPath } from '../config/site.ts';
import { readMark, writeMark } from '../store/intake-marks.ts';
import { insertMessage } from '../store/messages.ts';
import { type Beyond, isOlder } from './beyond-ledger.ts';
import type { Draft } from './draft.ts';
import { siteFacts } from './fact-names.ts';
import { readHealth } from './health.ts';
import { type MailTools, wallMsOf } from './mail-tools.ts';
import type { SiteView } from './site-view.ts';
import { deliveriesFor } from './store-draft.ts';

/**
 * Word from the service itself when it starts for the first time or after an unclean stop: what it watches and whom it
 * tells, so that a wrong site file and a crashing service are noticed. A service that crashes again and again says so at
 * most once an hour; acts of people that an older ledger lacks are named whenever they are found.
 */
export type StartKind = 'first' | 'unclean' | 'clean';

const announcedMark = 'start-announced-ms';
const hourMs = 3_600_000;

/** True where a message was put into the outbox. */
export async function announceStart(tools: MailTools, how: StartKind, beyond: Beyond): Promise<boolean> {
  const { ledger, clock } = tools;
  const view = tools.view();
  const { mail } = view.site;
  const older = isOlder(beyond);
  if ((how === 'clean' && !older) || mail === null) return false;
  const nowMs = wallMsOf(clock);
  const isRecent = (mark: string | null) => beyond.acts.length === 0 && recent(mark, nowMs);
  if (isRecent(await ledger.read((reader) => readMark(reader, announcedMark)))) return false;
  const start = older
    ? 'start-with-older-ledger'
    : how === 'first'
      ? 'first-start'
      : 'start-after-unclean-stop';
  const facts = startFacts(view, start, beyond, nowMs);
  const words = serviceMail(facts);
  // A start has no other name than its time; it is in the ledger, so a repeat has the same.
  const identity = messageIdentity(ledger.id, 'service', [facts.kind, String(tools.startedMs)]);
  const at = { ms: nowMs, timeZone: view.site.timeZone };
  const recipients = reachOf(recipientsAt(mail.to, at), null, 'trouble').addresses;
  const everyone = recipients.length > 0 ? recipients : mail.to.map(({ address }) => address);
  const draft: Draft = {
    kind: 'service',
    identity,
    priority: priorityOf('service', null),
    groupKey: 'service',
    subject: words.subject,
    tells: [],
    mails: [...new Set(everyone)].map((recipient) => ({ recipient, mail: words, earlier: [] })),
    thread: null,
  };
  const deliveries = await deliveriesFor(draft, mail.from, nowMs);
  const { kind, priority, groupKey, subject } = draft;
  const stored = await ledger.transact(async (writer) => {
    if (isRecent(await readMark(writer, announcedMark))) return false;
    await writeMark(writer, announcedMark, String(nowMs));
    const message = { kind, identity, priority, groupKey, subject, deliveries };
    await insertMessage(writer, {
      ...message,
      threadId: null,
      tells: [],
      createdMs: nowMs,
      notBeforeMs: 0,
    });
    return true;
  });
  if (stored) tools.step('delivery: message stored');
  return stored;
}

/** Said within the last hour. A time to come means that the clock was set back: then it is said. */
function recent(mark: string | null, nowMs: number): boolean {
  const agoMs = mark === null ? hourMs : nowMs - Number(mark);
  return agoMs >= 0 && agoMs < hourMs;
}

function startFacts(
  view: SiteView,
  kind: ServiceStartFacts['kind'],
  { recordings, acts }: Beyond,
  nowMs: number,
): ServiceStartFacts {
  const { site, points } = view;
  const { summary, mail } = site;
  const two = (number: number) => String(number).padStart(2, '0');
  const recipients = [...(mail?.to ?? []), ...(summary?.to ?? [])].map(({ address }) => address);
  return {
    kind,
    site: siteFacts(view),
    writtenMs: nowMs,
    machines: site.machines.length,
    points: points.length,
    limits: points.reduce((sum, { limits }) => sum + limits.length, 0),
    pointsWithoutLimit: points.filter(({ limits }) => limits.length === 0).map(pointPath),
    recipients: new Set(recipients).size,
    summaryAt: summary === null ? null : `${two(summary.at.hour)}:${two(summary.at.minute)}`,
    dropFolder: site.folders.drop,
    lastSeenMs: kind === 'first-start' ? null : (readHealth(site.folders.data)?.roundMs ?? null),
    takenAgain: recordings.length,
    lostActs: acts,
  };
}
