/** What is made of a server's answers, by the command that they answer. */
import { once } from 'node:events';
import { type AddressInfo, createServer, type Socket } from 'node:net';
import { expect, it, onTestFinished } from 'vitest';
import { createMailer } from '../../src/advisory/mailer.ts';

/** A server that says yes to everything but one command; `at` 'greeting': it does not even greet. */
async function serverRefusing(at: string, answer: string): Promise<number> {
  const usual = (line: string) =>
    /^(EHLO|HELO)/.test(line) ? '250 mail.trial.example' : line === 'DATA' ? '354 go on' : '250 ok';
  const speak = (socket: Socket) => {
    socket.write(`${at === 'greeting' ? answer : '220 mail.trial.example'}\r\n`);
    socket.on('error', () => {});
    socket.on('data', (bytes) => {
      for (const line of bytes.toString().split('\r\n').filter(Boolean))
        socket.write(`${at !== 'greeting' && new RegExp(`^(${at})`).test(line) ? answer : usual(line)}\r\n`);
    });
  };
  const server = createServer(speak).listen(0, '127.0.0.1');
  onTestFinished(() => void server.close());
  await once(server, 'listening');
  return (server.address() as AddressInfo).port;
}

async function answerTo(at: string, answer: string) {
  const port = await serverRefusing(at, answer);
  const host = '127.0.0.1';
  const mailer = createMailer({ host, port, security: 'none', user: null, passwordFile: null });
  const bytes = Buffer.from('Subject: trial\r\n\r\ntrial\r\n');
  const { kind, server } = await mailer.send({
    from: 'a@trial.example',
    recipient: 'b@trial.example',
    bytes,
  });
  return { kind, server };
}

it.each([
  ['greeting', '554 no mail service here'],
  ['EHLO|HELO', '550 you are not on the list'],
  ['MAIL', '530 5.7.0 authentication required'],
  ['MAIL', '550 5.7.1 sender rejected'],
  ['RCPT', '530 5.7.0 authentication required'],
])('a refusal at %s (%s) is about the service, so no mail is given up for it', async (at, answer) => {
  expect(await answerTo(at, answer)).toEqual({ kind: 'later', server: 'out' });
});

it.each([
  ['MAIL', '552 5.3.4 message too large'],
  ['RCPT', '550 5.1.1 no such user'],
  ['DATA', '554 no valid recipients'],
])('a refusal at %s (%s) is about this mail, and final', async (at, answer) => {
  expect(await answerTo(at, answer)).toEqual({ kind: 'never', server: undefined });
});

it('a mail that the server takes is accepted', async () => {
  expect(await answerTo('VRFY', '500 no')).toEqual({ kind: 'accepted', server: undefined });
});

it('a server that never falls silent and never comes to an end is left after the time of an attempt', async () => {
  let closed: Promise<unknown> | null = null;
  const server = createServer((socket) => {
    socket.write('220-mail.trial.example\r\n');
    const drip = setInterval(() => socket.write('220-please wait\r\n'), 20);
    socket.on('error', () => {});
    socket.on('data', () => {});
    closed = once(socket, 'close').then(() => clearInterval(drip));
  }).listen(0, '127.0.0.1');
  onTestFinished(() => void server.close());
  await once(server, 'listening');
  const { port } = server.address() as AddressInfo;
  const mailer = createMailer(
    { host: '127.0.0.1', port, security: 'none', user: null, passwordFile: null },
    { attemptTimeoutMs: 300 },
  );
  const bytes = Buffer.from('Subject: trial\r\n\r\ntrial\r\n');
  expect(await mailer.send({ from: 'a@trial.example', recipient: 'b@trial.example', bytes })).toEqual({
    kind: 'later',
    answer: 'not through within 0.3 s',
    server: 'out',
  });
  await closed;
  expect(closed).not.toBe(null);
});
