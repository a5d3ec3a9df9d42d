import type { Mail } from '../advisory/facts.ts';
import { type MailPicture, mailBytes } from '../advisory/mail-bytes.ts';
import { isWorse, mailId } from '../advisory/outbox.ts';
import type { Writer } from '../store/lent-connection.ts';
import { areUntold, insertMessage, type NewDelivery } from '../store/messages.ts';
import { changeThread, closeThread, openThread, openThreadOf } from '../store/threads.ts';
import type { Draft, DraftThread } from './draft.ts';
import { mailPictures } from './mail-pictures.ts';

/**
 * The bytes of a draft's mails. The mail library builds them over several turns of the event loop, so this is done
 * between reading the ledger and writing to it, never inside a transaction. `undrawn` hears of pictures left out.
 */
export async function deliveriesFor(
  draft: Draft,
  from: string,
  dateMs: number,
  undrawn: (name: string, reason: string) => void = () => {},
): Promise<NewDelivery[]> {
  const deliveries: NewDelivery[] = [];
  const drawn = new Map<Mail, MailPicture[]>();
  for (const { recipient, mail, earlier } of draft.mails) {
    if (!drawn.has(mail)) drawn.set(mail, mailPictures(mail, undrawn));
    const id = mailId(draft.identity, recipient, from);
    const bytes = await mailBytes({
      mailId: id,
      from,
      to: recipient,
      subject: mail.subject,
      dateMs,
      text: mail.text,
      html: mail.html,
      pictures: drawn.get(mail) ?? [],
      firstOfThread: earlier[0] ?? null,
      lastOfThread: earlier.at(-1) ?? null,
    });
    deliveries.push({ recipient, mailId: id, bytes, dueMs: dateMs });
  }
  return deliveries;
}

/**
 * Stores a draft with its deliveries, and marks its events as told, in the transaction that is handed in. False, and
 * nothing is stored, where the ledger has moved on since the draft was made: it is to be made again.
 */
export async function storeDraft(
  writer: Writer,
  draft: Draft,
  deliveries: readonly NewDelivery[],
  nowMs: number,
): Promise<boolean> {
  if (!(await areUntold(writer, draft.tells))) return false;
  const threadId = draft.thread === null ? null : await keepThread(writer, draft, draft.thread, nowMs);
  if (threadId === 'changed') return false;
  const { kind, identity, priority, groupKey, subject, tells } = draft;
  const message = { kind, identity, priority, groupKey, subject, tells, threadId, deliveries };
  await insertMessage(writer, { ...message, createdMs: nowMs, notBeforeMs: 0 });
  return true;
}

/** The thread that the message belongs to: begun, gone on with, or given a new subject because the severity rose. */
async function keepThread(
  writer: Writer,
  draft: Draft,
  thread: DraftThread,
  nowMs: number,
): Promise<number | null | 'changed'> {
  const { machineId, open, goesOn, severity } = thread;
  const now = await openThreadOf(writer, machineId);
  if (now?.id !== open?.id || now?.subject !== open?.subject) return 'changed';
  if (draft.mails.length === 0) return null;
  const { subject } = draft;
  if (open === null || !goesOn) {
    if (open !== null) await closeThread(writer, open.id, nowMs);
    return openThread(writer, { machineId, openedMs: nowMs, subject, severity });
  }
  if (isWorse(severity, open.severity)) await changeThread(writer, open.id, { subject, severity });
  return open.id;
}
