import { subjectKey } from '../detection/alarm.ts';
import type { TroubleSubject } from '../detection/trouble.ts';
import type { DueDelivery } from '../store/deliveries.ts';
import { appendJournal } from '../store/journal.ts';
import type { Writer } from '../store/lent-connection.ts';
import { type ChangeContext, saveAlarmChange } from '../store/save-alarm.ts';
import { refusedRecipients } from '../store/waiting-mail.ts';
import { lookAtTrouble, statesOf } from './evaluate.ts';
import type { SiteView } from './site-view.ts';

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

/** Part of the transaction that stores an acceptance. */
export async function noteAccepted(writer: Writer, view: SiteView, wallMs: number): Promise<void> {
  const state = (await statesOf(writer, [mailRefusedSubject])).get(subjectKey(mailRefusedSubject));
  if (state?.condition !== 'trouble') return;
  const { mail, summary } = view.site;
  const recipients = [...(mail?.to ?? []), ...(summary?.to ?? [])].map(({ address }) => address);
  if ((await refusedRecipients(writer, [...new Set(recipients)])).length > 0) return;
  const look = { present: false, usedMs: wallMs, reason: {} };
  const change = await lookAtTrouble(writer, mailRefusedSubject, look);
  if (change !== null) await saveAlarmChange(writer, change, contextOf(view, wallMs));
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
