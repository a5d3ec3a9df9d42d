import { expect, it } from 'vitest';
import { ann, hourMs, MailBench } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

it('the mail of a chattering alert says so, and what its limit could do about it; no other mail does', async () => {
  const server = await MailServerOnLoopback.start();
  const b = await MailBench.start({
    tree: { pump: { de: ['overall'] } },
    port: server.port,
    to: [{ address: ann }],
  });
  for (let n = 0; n < 6; n++) {
    for (const level of [3, 1]) {
      await b.record('pump/de', { overall: level });
      await b.pass(hourMs);
    }
  }
  const texts = server.got.map(({ mail }) => (mail.text ?? '').replace(/\s+/g, ' '));
  expect(texts).toHaveLength(4);
  expect(texts.filter((text) => text.includes('Comes and goes'))).toEqual([texts[3]]);
  expect(texts[3]).toContain('Comes and goes it came back 3 times within 24 recordings.');
  expect(texts[3]).toContain('Until that stops it is not mailed each time; a danger always is.');
  expect(texts[3]).toContain(
    'a wider deadband (now 10 %) or a longer on_delay (now 1 recording), unless the machine itself comes and goes.',
  );
  await server.stop();
});
