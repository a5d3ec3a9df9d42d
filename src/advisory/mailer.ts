import { readFile, stat } from 'node:fs/promises';
import { createTransport } from 'nodemailer';
import type { MailServer } from '../config/site.ts';
import type { AttemptAnswer } from './outbox.ts';

/**
 * One attempt to hand one stored mail to one server for one recipient. It never throws: every outcome is an answer.
 *   accepted: the server took it (2xx after the data).
 *   later:    no connection, no usable TLS, a timeout, 4xx, a password file that cannot be used yet, or a refusal before
 *             the server has heard of recipient and mail: that is about the service, and the site's to mend.
 *   never:    5xx to the recipient or the mail.
 * The password is read at each attempt and goes nowhere else.
 */
export interface Mailer {
  send(mail: {
    readonly from: string;
    readonly recipient: string;
    readonly bytes: Uint8Array;
  }): Promise<AttemptAnswer>;
}

export interface MailerOptions {
  /** Certificates to trust beside the system's. */
  readonly extraCertificates?: readonly string[];
  readonly connectTimeoutMs?: number;
  readonly idleTimeoutMs?: number;
  /** The whole attempt. */
  readonly attemptTimeoutMs?: number;
}

const connectTimeoutMs = 20_000;
const idleTimeoutMs = 60_000;
/** A server that says a little now and then never falls silent, and would hold up all mail. */
const attemptTimeoutMs = 180_000;

export function createMailer(server: MailServer, options: MailerOptions = {}): Mailer {
  return {
    async send({ from, recipient, bytes }) {
      const login = await loginFor(server);
      if ('answer' in login) return { kind: 'later', answer: login.answer, server: 'out' };
      const transport = createTransport({
        host: server.host,
        port: server.port,
        secure: server.security === 'tls',
        requireTLS: server.security === 'starttls',
        ignoreTLS: server.security === 'none',
        connectionTimeout: options.connectTimeoutMs ?? connectTimeoutMs,
        greetingTimeout: options.connectTimeoutMs ?? connectTimeoutMs,
        socketTimeout: options.idleTimeoutMs ?? idleTimeoutMs,
        dnsTimeout: options.connectTimeoutMs ?? connectTimeoutMs,
        disableFileAccess: true,
        disableUrlAccess: true,
        logger: false,
        ...(options.extraCertificates ? { tls: { ca: [...options.extraCertificates] } } : {}),
        ...(login.user !== null ? { auth: { user: login.user, pass: login.password } } : {}),
      });
      const mostMs = options.attemptTimeoutMs ?? attemptTimeoutMs;
      const signal = AbortSignal.timeout(mostMs);
      try {
        const done = await transport.sendMail({
          envelope: { from: addressOf(from), to: [recipient] },
          raw: Buffer.from(bytes),
          signal,
        });
        return { kind: 'accepted', answer: oneLine(done.response) };
      } catch (error) {
        if (signal.aborted)
          return { kind: 'later', answer: `not through within ${mostMs / 1000} s`, server: 'out' };
        return answerOf(error as SmtpError, login.user === null ? null : login.password);
      } finally {
        transport.close();
      }
    },
  };
}

interface SmtpError extends Error {
  readonly code?: string;
  /** The system's own code, such as ECONNREFUSED. */
  readonly originalCode?: string;
  readonly timeoutType?: string;
  readonly responseCode?: number;
  readonly response?: string;
  /** What the server answered to; CONN: its greeting. */
  readonly command?: string;
}

/**
 * 5xx to the message or its recipient is final; a refused login, TLS or sender is the site's to mend, so it is tried
 * again.
 */
function answerOf(error: SmtpError, secret: string | null): AttemptAnswer {
  const said = oneLine(error.response ?? error.message);
  const answer = secret === null || secret === '' ? said : said.replaceAll(secret, '(password)');
  const mendable =
    error.code === 'EAUTH' ||
    error.code === 'ETLS' ||
    error.code === 'ESOCKET' ||
    error.code === 'ECONNECTION' ||
    refusesService(error);
  // An address that cannot even be offered to a server never will be.
  const unusable = error.code === 'EENVELOPE' && error.responseCode === undefined;
  const final = unusable || (!mendable && error.responseCode !== undefined && error.responseCode >= 500);
  const server = final ? undefined : serverOf(error);
  return {
    kind: final ? 'never' : 'later',
    answer: error.code ? `${answer} (${error.code})` : answer,
    ...(server === undefined ? {} : { server }),
  };
}

/**
 * The server turns the service away, whatever the mail: at its greeting, at EHLO, at the sender's address, or because it
 * wants a login (RFC 4954 section 6: 530, 534, 538). 552 to the sender's line is about the size of this mail.
 */
function refusesService({ command, responseCode }: SmtpError): boolean {
  if (responseCode === undefined) return false;
  if ([530, 534, 538].includes(responseCode)) return true;
  if (command === 'MAIL FROM') return responseCode !== 552;
  return command === 'CONN' || command === 'EHLO' || command === 'HELO';
}

/** A server that spoke and then closed or fell silent may have stumbled over this very mail; any other failure is its own. */
function serverOf(error: SmtpError): AttemptAnswer['server'] {
  if (error.code === 'EAUTH' || error.code === 'ETLS' || error.responseCode === 421) return 'out';
  if (refusesService(error)) return 'out';
  if (error.responseCode !== undefined) return undefined;
  const closed = error.code === 'ECONNECTION' && error.message.startsWith('Connection closed');
  const reset = error.originalCode === 'ECONNRESET' || error.originalCode === 'EPIPE';
  return closed || reset || error.timeoutType === 'SOCKET_TIMEOUT' ? 'gone' : 'out';
}

type Login =
  | { readonly user: string; readonly password: string }
  | { readonly user: null }
  | { readonly answer: string };

async function loginFor(server: MailServer): Promise<Login> {
  if (server.user === null || server.passwordFile === null) return { user: null };
  if (server.security === 'none')
    return { answer: 'no password is sent without TLS: set security to starttls or tls' };
  const file = server.passwordFile;
  try {
    const { mode } = await stat(file);
    if (process.platform !== 'win32' && (mode & 0o077) !== 0) {
      return { answer: `password file ${file} can be read by others: chmod 600 it` };
    }
    return { user: server.user, password: (await readFile(file, 'utf8')).trimEnd() };
  } catch (error) {
    return {
      answer: `password file ${file} cannot be read: ${(error as NodeJS.ErrnoException).code ?? 'unknown error'}`,
    };
  }
}

function addressOf(from: string): string {
  return /<([^<>]+)>\s*$/.exec(from)?.[1] ?? from.trim();
}

function oneLine(text: string): string {
  return text.replace(/\s+/g, ' ').trim().slice(0, 500);
}
