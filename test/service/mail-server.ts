import { readFileSync } from 'node:fs';
import { connect } from 'node:net';
import { type ParsedMail, simpleParser } from 'mailparser';
import { SMTPServer, type SMTPServerOptions } from 'smtp-server';
import { onTestFinished } from 'vitest';

const folder = new URL('../files/certificates/', import.meta.url);
export const loopbackCertificate = readFileSync(new URL('loopback.cert.pem', folder), 'utf8');
const loopbackKey = readFileSync(new URL('loopback.key.pem', folder), 'utf8');

/** What the server says to a recipient, or after the data. Undefined: it takes it. */
export type Behaviour = (recipient: string) => number | 'drop' | 'stall' | undefined;

export interface Got {
  readonly recipient: string;
  readonly raw: string;
  readonly mail: ParsedMail;
}

/** A real SMTP server on loopback that notes whom it got what, and that can be told to misbehave. */
export class MailServerOnLoopback {
  readonly got: Got[] = [];
  /** Connections that were made. */
  connections = 0;
  /** Passwords that somebody showed it. */
  readonly passwords: (string | undefined)[] = [];
  /** Everything that came in clear. */
  atRecipient: Behaviour = () => undefined;
  atData: Behaviour = () => undefined;
  port = 0;
  readonly #options: SMTPServerOptions;
  #server: SMTPServer | null = null;

  constructor(options: SMTPServerOptions = {}) {
    this.#options = options;
    onTestFinished(() => this.stop());
  }

  static async start(options: SMTPServerOptions = {}): Promise<MailServerOnLoopback> {
    const made = new MailServerOnLoopback(options);
    await made.start();
    return made;
  }

  async start(): Promise<void> {
    const server = new SMTPServer({
      authOptional: true,
      disabledCommands: ['STARTTLS'],
      disableReverseLookup: true,
      closeTimeout: 100,
      ...this.#options,
      onConnect: (_session, done) => {
        this.connections++;
        done();
      },
      onAuth: (auth, _session, done) => {
        this.passwords.push(auth.password ?? undefined);
        done(null, { user: 'somebody' });
      },
      onRcptTo: ({ address }, session, done) => {
        const says = this.atRecipient(address);
        if (says === 'drop') this.#cut(session.id);
        else if (says !== 'stall') done(says === undefined ? null : answer(says));
      },
      onData: (stream, session, done) => {
        const recipient = session.envelope.rcptTo[0]?.address ?? '';
        const says = this.atData(recipient);
        if (says === 'drop') {
          stream.once('data', () => this.#cut(session.id));
          stream.resume();
          return;
        }
        const parts: Buffer[] = [];
        stream.on('data', (part: Buffer) => parts.push(part));
        stream.on('end', () => {
          if (says === 'stall') return;
          if (says !== undefined) return done(answer(says));
          const raw = Buffer.concat(parts).toString();
          simpleParser(raw).then((mail) => {
            this.got.push({ recipient, raw, mail });
            done();
          }, done);
        });
      },
    });
    server.on('error', () => {});
    this.#server = server;
    const net = server.listen(this.port, '127.0.0.1');
    await new Promise<void>((resolve, reject) => {
      net.once('listening', resolve);
      net.once('error', reject);
    });
    this.port = (net.address() as { port: number }).port;
  }

  /** Nobody listens any more on its port. */
  async stop(): Promise<void> {
    const server = this.#server;
    this.#server = null;
    if (server !== null) await new Promise<void>((resolve) => server.close(() => resolve()));
  }

  to(recipient: string): ParsedMail[] {
    return this.got.filter((one) => one.recipient === recipient).map(({ mail }) => mail);
  }

  #cut(sessionId: string): void {
    for (const connection of this.#server?.connections ?? []) {
      if (connection.id === sessionId) connection._socket.destroy();
    }
  }
}

function answer(code: number): Error {
  return Object.assign(new Error(`answered with ${code}`), { responseCode: code });
}

/** With a certificate for localhost that only `extraCertificates` makes trusted. */
export const withTls: SMTPServerOptions = {
  disabledCommands: [],
  key: loopbackKey,
  cert: loopbackCertificate,
};

/** A port on which nobody listens. */
export async function closedPort(): Promise<number> {
  const server = await MailServerOnLoopback.start();
  await server.stop();
  await new Promise<void>((resolve) => {
    const socket = connect(server.port, '127.0.0.1');
    socket.once('error', () => resolve());
    socket.once('connect', () => {
      socket.destroy();
      resolve();
    });
  });
  return server.port;
}
