import { mkdirSync, writeFileSync } from 'node:fs';
import type { AddressInfo } from 'node:net';
import { join } from 'node:path';
import { SMTPServer } from 'smtp-server';

/** A real SMTP server on loopback that keeps what it accepts as .eml files. */
export interface MailCatcher {
  readonly port: number;
  /** Names of the files, in the order in which the mails came. */
  readonly mails: readonly string[];
  close(): Promise<void>;
}

/** `nowMs`: the demo's clock, by which the files are named. */
export async function catchMails(folder: string, nowMs: () => number): Promise<MailCatcher> {
  mkdirSync(folder, { recursive: true });
  const mails: string[] = [];
  const server = new SMTPServer({
    authOptional: true,
    disabledCommands: ['AUTH', 'STARTTLS'],
    onData(stream, session, callback) {
      const parts: Buffer[] = [];
      stream.on('data', (part: Buffer) => parts.push(part));
      stream.on('end', () => {
        const bytes = Buffer.concat(parts);
        const name = `${String(mails.length + 1).padStart(4, '0')}_${stampOf(nowMs())}_${nameOfMail(bytes, session.envelope.rcptTo)}.eml`;
        writeFileSync(join(folder, name), bytes);
        mails.push(name);
        callback();
      });
    },
  });
  await new Promise<void>((resolve, reject) => {
    server.once('error', reject);
    server.listen(0, '127.0.0.1', resolve);
  });
  return {
    port: (server.server.address() as AddressInfo).port,
    mails,
    close: () => new Promise((resolve) => server.close(resolve)),
  };
}

function stampOf(ms: number): string {
  return new Date(ms).toISOString().slice(0, 16).replace(':', '');
}

/** What the mail is (ALERT-5, summary, ...) and to whom it goes, in letters that every file system takes. */
function nameOfMail(bytes: Buffer, to: readonly { readonly address: string }[]): string {
  const head = bytes.subarray(0, 4096).toString('latin1').split('\r\n\r\n')[0] ?? '';
  const encoded = /^Subject: (.*(?:\r\n[ \t].*)*)$/im.exec(head)?.[1] ?? '';
  // RFC 2047: Q-encoded words; enough is read of them for a file's name.
  const subject = encoded
    .replace(/=\?[^?]*\?Q\?/gi, '')
    .replace(/=3A/g, ':')
    .replace(/_/g, ' ');
  const alarm = /^(ALERT|DANGER|TROUBLE) (\d+)/.exec(subject);
  const kind =
    alarm !== null ? `${alarm[1]}-${alarm[2]}` : /: service started/.test(subject) ? 'service' : 'summary';
  return `${kind}_${to[0]?.address.split('@')[0]?.replace(/[^A-Za-z0-9]+/g, '-') ?? ''}`;
}
