import type { Mail } from '../advisory/facts.ts';
import { mailBytes } from '../advisory/mail-bytes.ts';
import { createMailer } from '../advisory/mailer.ts';
import { type AttemptAnswer, mailId, messageIdentity } from '../advisory/outbox.ts';
import type { MailSettings } from '../config/site.ts';
import { mailPictures } from './mail-pictures.ts';
import type { MailerFor } from './mail-tools.ts';

export interface SentNow {
  readonly recipient: string;
  readonly answer: AttemptAnswer;
}

/**
 * Hands one mail to the server at once, outside the outbox, for somebody who waits for the answer (`check --mail`,
 * `summary --send`). One attempt a recipient; nothing is stored or tried again. `about` names what is sent; with the time it
 * makes the Message-ID.
 */
export async function sendNow(
  mail: Mail,
  to: {
    readonly settings: MailSettings;
    readonly recipients: readonly string[];
    readonly about: string;
    readonly nowMs: number;
    readonly mailerFor?: MailerFor;
    readonly undrawn?: (name: string, reason: string) => void;
  },
): Promise<SentNow[]> {
  const { from, server } = to.settings;
  const identity = messageIdentity('asked for', to.about, [String(to.nowMs)]);
  const mailer = (to.mailerFor ?? createMailer)(server);
  const sent: SentNow[] = [];
  const pictures = mailPictures(mail, to.undrawn ?? (() => {}));
  for (const recipient of new Set(to.recipients)) {
    const bytes = await mailBytes({
      mailId: mailId(identity, recipient, from),
      from,
      to: recipient,
      subject: mail.subject,
      dateMs: to.nowMs,
      text: mail.text,
      html: mail.html,
      pictures,
      firstOfThread: null,
      lastOfThread: null,
    });
    sent.push({ recipient, answer: await mailer.send({ from, recipient, bytes }) });
  }
  return sent;
}
