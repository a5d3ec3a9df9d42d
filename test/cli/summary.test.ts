import { readFileSync } from 'node:fs';
import { join } from 'node:path';
import { type ParsedMail, simpleParser } from 'mailparser';
import { SMTPServer } from 'smtp-server';
import { expect, test } from 'vitest';
import { run, siteText, smallSite } from './small-site.ts';

const mails: ParsedMail[] = [];

async function mailServer(): Promise<{ readonly port: number; close(): Promise<void> }> {
  const server = new SMTPServer({
    authOptional: true,
    disabledCommands: ['STARTTLS'],
    onRcptTo: ({ address }, _session, done) =>
      done(
        address.startsWith('nobody')
          ? Object.assign(new Error('no such person'), { responseCode: 550 })
          : null,
      ),
    onData(stream, _session, done) {
      simpleParser(stream).then((mail) => {
        mails.push(mail);
        done();
      }, done);
    },
  });
  await new Promise<void>((resolve) => server.listen(0, '127.0.0.1', resolve));
  const address = server.server.address();
  if (address === null || typeof address === 'string') throw new Error('no port');
  return { port: address.port, close: () => new Promise((resolve) => server.close(() => resolve())) };
}

test('the summary as it would be now: as text, as a file, by mail; nothing counts as told', async () => {
  const server = await mailServer();
  const site = await smallSite(`${siteText}mail:
  from: humledger@larkfen.example
  server:
    host: 127.0.0.1
    port: ${server.port}
    security: none
  to:
    - address: maintenance@larkfen.example
summary:
  at: '06:30'
  to:
    - address: maintenance@larkfen.example
    - address: nobody@larkfen.example
`);
  try {
    await site.hour(0);
    const at = { workingFolder: site.folder, clock: site.clock };
    const text = await run(['summary'], at);
    expect(text).toMatchObject({ status: 0, err: '' });
    expect(text.out).toContain('Larkfen Waterworks, Mon 2 Mar 2026, 06:00');
    expect(text.out.replace(/\s+/g, ' ')).toContain('must never replace or drive a trip');
    const file = await run(['summary', '--out', 'now.html'], at);
    expect(file).toMatchObject({ status: 0, out: `${join(site.folder, 'now.html')}\n` });
    expect(readFileSync(join(site.folder, 'now.html'), 'utf8')).toContain('Aeration blower 1');
    const wrong = await run(['summary', '--out', 'nowhere/now.html'], at);
    expect(wrong).toMatchObject({ status: 1, out: '' });
    expect(wrong.err).toContain('cannot be written: ENOENT');

    const before = mails.length;
    const sent = await run(['summary', '--send'], at);
    expect(sent.status).toBe(1);
    expect(sent.out).toMatch(/^maintenance@larkfen\.example: accepted: 250/);
    expect(sent.err).toMatch(/^nobody@larkfen\.example: not accepted: 550/);
    expect(mails).toHaveLength(before + 1);
    expect(mails.at(-1)?.text?.replace(/\s+/g, ' ')).toContain('Larkfen Waterworks, Mon 2 Mar 2026, 06:00');
    const status = JSON.parse((await run(['status', '--json'], at)).out);
    expect(status.last_summary).toBeNull();
  } finally {
    await site.remove();
    await server.close();
  }
}, 60_000);

test('without mail in the site file it cannot be sent, and says so', async () => {
  const site = await smallSite();
  try {
    const ran = await run(['summary', '--send', '--site', site.file]);
    expect(ran).toMatchObject({ status: 1, out: '' });
    expect(ran.err).toContain('the site file has no mail');
  } finally {
    await site.remove();
  }
});
