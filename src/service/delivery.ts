import type { Mailer } from '../advisory/mailer.ts';
import { type AttemptAnswer, afterAttempt, type DeliveryStep, pauseMs } from '../advisory/outbox.ts';
import type { MailSettings } from '../config/site.ts';
import { type DueDelivery, storeAnswer } from '../store/deliveries.ts';
import { noteAccepted, noteRefused } from './mail-refused.ts';
import { type MailTools, mailerOf, wallMsOf } from './mail-tools.ts';

/**
 * One attempt at one delivery, then its answer in the ledger. A kill between the two means that the mail goes out again,
 * with the same bytes and the same Message-ID. A ledger that cannot be written between the two must not mean that: the
 * rounds hold on to the answer and store it before anything else is sent.
 */
/** What a server said to one attempt; to be kept in the ledger. */
export interface Answered {
  readonly due: DueDelivery;
  readonly answer: AttemptAnswer;
  readonly next: DeliveryStep;
  readonly triedMs: number;
  readonly pauseMs: number;
}

export async function handOver(tools: MailTools, mail: MailSettings, due: DueDelivery): Promise<Answered> {
  const { message, delivery } = due;
  tools.step('delivery: attempt begun');
  const answer = await sendTo(tools, mail, { ...delivery, from: mail.from });
  tools.step('delivery: answer received');
  const triedMs = wallMsOf(tools.clock);
  const before = { createdMs: message.createdMs, danger: message.priority === 0, tries: delivery.tries };
  const next = afterAttempt(before, answer, triedMs);
  const answered = { due, answer, next, triedMs, pauseMs: pauseMs(before, triedMs) };
  logAnswer(tools, answered);
  return answered;
}

/** One transaction: the delivery's state, and what a refusal or an acceptance does to the trouble 'mail refused'. */
export async function keepAnswer(tools: MailTools, { due, answer, next, triedMs }: Answered): Promise<void> {
  await tools.ledger.transact(async (writer) => {
    const stored = await storeAnswer(writer, due.delivery.mailId, { ...next, triedMs });
    if (!stored) return;
    if (next.state === 'failed') await noteRefused(writer, tools.view(), due, answer.answer, triedMs);
    if (next.state === 'accepted') await noteAccepted(writer, tools.view(), due.delivery.recipient, triedMs);
  });
  tools.step('delivery: answer stored');
}

interface Sending {
  readonly from: string;
  readonly recipient: string;
  readonly bytes: Uint8Array;
}

/** The first server, and where it does not take the mail the second one, with the same bytes. */
async function sendTo(tools: MailTools, mail: MailSettings, sending: Sending): Promise<AttemptAnswer> {
  const first = await mailerOf(tools, mail.server).send(sending);
  if (first.kind === 'accepted' || mail.secondServer === null) return first;
  return eitherAnswer(first, await secondAnswer(mailerOf(tools, mail.secondServer), sending));
}

function secondAnswer(mailer: Mailer, sending: Sending): Promise<AttemptAnswer> {
  return mailer.send(sending);
}

/** Refused for good only by both; a server out of reach may still take it later. */
export function eitherAnswer(first: AttemptAnswer, second: AttemptAnswer): AttemptAnswer {
  const answer = `${first.answer}; second server: ${second.answer}`;
  if (second.kind === 'accepted') return { kind: 'accepted', answer };
  const kind = first.kind === 'never' && second.kind === 'never' ? 'never' : 'later';
  // Where one of the two still speaks, other mails are worth a try.
  const server = first.server === undefined || second.server === undefined ? undefined : second.server;
  return server === undefined ? { kind, answer } : { kind, answer, server };
}

function logAnswer(tools: MailTools, { due, answer, next }: Answered): void {
  const { message, delivery } = due;
  const about = {
    kind: message.kind,
    recipient: delivery.recipient,
    mail_id: delivery.mailId,
    tries: next.tries,
    answer: answer.answer,
  };
  if (next.state === 'accepted') {
    tools.log.info(about, 'mail accepted');
    tools.complaints.over('mail');
  } else if (next.state === 'failed') tools.log.error(about, 'mail refused for good');
  else if (next.tries === 1) tools.log.warn(about, 'mail not accepted yet; it is kept and tried again');
  else tools.complaints.say('mail', `mail to ${delivery.recipient} still waits: ${answer.answer}`);
}
