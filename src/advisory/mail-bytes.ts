import MailComposer from 'nodemailer/lib/mail-composer';

export interface MailPicture {
  readonly name: string;
  readonly png: Uint8Array;
}

/** Content-ID by which the HTML part shows a picture that the mail carries (RFC 2392). */
export function pictureId(name: string): string {
  return `${name}@humledger.invalid`;
}

/** One mail to one recipient, as it will be stored and sent. */
export interface MailParts {
  readonly mailId: string;
  readonly from: string;
  readonly to: string;
  readonly subject: string;
  readonly dateMs: number;
  readonly text: string;
  readonly html: string;
  /** Shown within the HTML part by `cid:`. */
  readonly pictures?: readonly MailPicture[];
  /** Message-ID of the first mail of the thread to this recipient; null: this is the first. */
  readonly firstOfThread: string | null;
  readonly lastOfThread: string | null;
}

/**
 * RFC 5322 bytes. `Auto-Submitted` (RFC 3834, section 5) keeps other machines from answering; In-Reply-To and
 * References hold a machine's mails together. The same parts give the same bytes.
 */
export function mailBytes(parts: MailParts): Promise<Uint8Array> {
  const thread = [parts.firstOfThread, parts.lastOfThread].filter((id): id is string => id !== null);
  const composer = new MailComposer({
    messageId: parts.mailId,
    from: parts.from,
    to: parts.to,
    subject: parts.subject.replace(/[\r\n]+/g, ' '),
    date: new Date(parts.dateMs),
    text: parts.text,
    html: parts.html,
    attachments: (parts.pictures ?? []).map(({ name, png }) => ({
      cid: pictureId(name),
      filename: `${name}.png`,
      content: Buffer.from(png),
      contentType: 'image/png',
      contentDisposition: 'inline' as const,
    })),
    headers: { 'Auto-Submitted': 'auto-generated' },
    baseBoundary: parts.mailId.replace(/[^A-Za-z0-9]/g, '').slice(0, 24),
    newline: '\r\n',
    ...(thread.length > 0 ? { inReplyTo: thread.at(-1) as string, references: [...new Set(thread)] } : {}),
  } as ConstructorParameters<typeof MailComposer>[0]);
  return composer.compile().build();
}
