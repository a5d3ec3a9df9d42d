import { subjectKey } from '../detection/alarm.ts';
import type { TroubleSubject } from '../detection/trouble.ts';
import { standingAlarms } from '../store/alarms.ts';
import type { DueDelivery } from '../store/deliveries.ts';
import { appendJournal, readJournal } from '../store/journal.ts';
import type { Reader, Writer } from '../store/lent-connection.ts';
import { type ChangeContext, saveAlarmChange } from '../store/save-alarm.ts';
import { lastTold, refusedRecipients, waitAgain } from '../store/waiting-mail.ts';
import { lookAtTrouble, statesOf } from './evaluate.ts';
import type { SiteView } from './site-view.ts';
import { stillStands } from './standing-facts.ts';

/**
 * The site's trouble 'mail refused': a server refused a mail for good. It stands until every recipient of the site
 * file has had one accepted again; were any acceptance enough, the mail that tells of it would end it and raise it
 * anew for ever.
 */
export const mailRefusedSubject: TroubleSubject = {
  kind: 'trouble',
  trouble: 'mail-refused',
  machineId: null,
  pointId: null,
  source: null,
};

const dayMs = 86_400_000;
/** What was refused longer ago is no news; the summary lists what stands. */
const tellAgainWithinMs = 14 * dayMs;
/** A mail that is refused for what is in it would go back and forth for ever. */
const mostRefusals = 3;

/** Part of the transaction that stores the refusal. Each refusal has its line in the journal. */
export async function noteRefused(
  writer: Writer,
  view: SiteView,
  { message, delivery }: DueDelivery,
  answer: string,
  wallMs: number,
): Promise<void> {
  const { recipient, mailId } = delivery;
  const reason = { detail: `${recipient}: ${answer}`, recipient, answer, mailId, subject: message.subject };
  await appendJournal(writer, {
    key: subjectKey(mailRefusedSubject),
    number: null,
    event: 'note',
    before: null,
    after: null,
    usedMs: null,
    wallMs,
    recordingId: null,
    configVersionId: view.ids.configVersionId,
    actor: 'service',
    via: 'service',
    comment: 'a mail was refused for good',
    reason,
  });
  const change = await lookAtTrouble(writer, mailRefusedSubject, { present: true, usedMs: wallMs, reason });
  if (change !== null) await saveAlarmChange(writer, change, contextOf(view, wallMs));
}

/**
 * Part of the transaction that stores an acceptance. Mails to that recipient that were refused meanwhile about what
 * still stands are due again, whether or not others are still refused: he may not have heard of it.
 */
export async function noteAccepted(
  writer: Writer,
  view: SiteView,
  recipient: string,
  wallMs: number,
): Promise<void> {
  const state = (await statesOf(writer, [mailRefusedSubject])).get(subjectKey(mailRefusedSubject));
  if (state?.condition !== 'trouble') return;
  const { mail, summary } = view.site;
  const recipients = [
    ...[...(mail?.to ?? []), ...(summary?.to ?? [])].map(({ address }) => address),
    ...nextRecipients(view),
  ];
  if ((await refusedRecipients(writer, [...new Set(recipients)])).length === 0) {
    const look = { present: false, usedMs: wallMs, reason: {} };
    const change = await lookAtTrouble(writer, mailRefusedSubject, look);
    if (change !== null) await saveAlarmChange(writer, change, contextOf(view, wallMs));
  }
  // Afterwards, so that a trouble that this ends is no news any more.
  const again = await toTellAgain(writer, view, recipient, wallMs);
  if (again.length > 0) await waitAgain(writer, again, wallMs);
}

/** Who is told when reminders have not helped. */
function nextRecipients({ site, points }: SiteView): string[] {
  const ofLimits = points.flatMap(({ limits }) => limits.flatMap(({ thenTo }) => thenTo ?? []));
  return [...new Set([...(site.mail?.reminders?.thenTo ?? []), ...ofLimits])];
}

/** Mails by Message-ID. Of one alarm the newest to that recipient: where it was accepted, he has been told. */
async function toTellAgain(
  reader: Reader,
  view: SiteView,
  recipient: string,
  wallMs: number,
): Promise<string[]> {
  const isKnown = view.site.mail?.to.some(({ address }) => address === recipient) === true;
  if (!isKnown && !nextRecipients(view).includes(recipient)) return [];
  const refusals = await refusalsByMail(reader);
  const again = new Set<string>();
  for (const standing of await standingAlarms(reader)) {
    if (!stillStands(standing)) continue;
    for (const told of await lastTold(reader, standing.life.number)) {
      if (told.recipient !== recipient) continue;
      const { mailId, state, lastTryMs } = told;
      const isRecent = lastTryMs !== null && wallMs - lastTryMs < tellAgainWithinMs;
      const wasRefused = state === 'failed' && (refusals.get(mailId) ?? 0) < mostRefusals;
      if (wasRefused && isRecent) again.add(mailId);
    }
  }
  return [...again];
}

/** How often each mail was refused, by the newest notes in the journal. */
async function refusalsByMail(reader: Reader): Promise<Map<string, number>> {
  const counts = new Map<string, number>();
  const notes = await readJournal(reader, { key: subjectKey(mailRefusedSubject), limit: 5_000 });
  for (const { event, reason } of notes) {
    if (event !== 'note' || typeof reason.mailId !== 'string') continue;
    counts.set(reason.mailId, (counts.get(reason.mailId) ?? 0) + 1);
  }
  return counts;
}

function contextOf(view: SiteView, wallMs: number): ChangeContext {
  return {
    ids: view.ids,
    wallMs,
    recordingId: null,
    actor: 'service',
    via: 'service',
    fromBacklog: false,
  };
}
