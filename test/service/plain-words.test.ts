/** What is told when the full text of a message cannot be composed. */
import Database from 'better-sqlite3';
import { expect, it, vi } from 'vitest';
import { untoldEvents } from '../../src/store/messages.ts';
import { ann, dayMs, hourMs, MailBench } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

// No site and no level is known to make the words fail, so the failure is put in their place; all else is real.
let summaryFails = false;
vi.mock('../../src/advisory/alarm-mail.ts', async (original) => {
  const real = await original<typeof import('../../src/advisory/alarm-mail.ts')>();
  const alarmMail: typeof real.alarmMail = (facts) => {
    if (facts.machine?.id === 'blower') throw new TypeError('no words for it');
    const mail = real.alarmMail(facts);
    return facts.machine?.id === 'fan' ? { ...mail, text: Symbol('not a text') as unknown as string } : mail;
  };
  return { ...real, alarmMail };
});
vi.mock('../../src/advisory/summary-mail.ts', async (original) => {
  const real = await original<typeof import('../../src/advisory/summary-mail.ts')>();
  const summaryMail: typeof real.summaryMail = (facts) => {
    if (summaryFails) throw new TypeError('no words for it');
    return real.summaryMail(facts);
  };
  return { ...real, summaryMail };
});

async function bench() {
  const server = await MailServerOnLoopback.start();
  const tree = { blower: { de: ['overall'] }, fan: { de: ['overall'] }, pump: { de: ['overall'] } };
  return { server, b: await MailBench.start({ port: server.port, to: [{ address: ann }], tree }) };
}

it('an alarm whose mail cannot be composed is told in plain words, once, and keeps no other', async () => {
  const { server, b } = await bench();
  for (const machine of ['blower', 'fan', 'pump']) await b.record(`${machine}/de`, { overall: 6 });
  await b.pass(hourMs, 10_000);
  const [blower, fan, pump] = [1, 2, 3].map((number) =>
    server.to(ann).find(({ subject }) => subject?.includes(`DANGER ${number}`)),
  );
  expect(server.got.length).toBe(3);
  expect(blower?.subject).toBe('Larkfen Waterworks: DANGER 1');
  expect(blower?.text).toContain('DANGER 1: blower, limit:blower/de/overall');
  expect(blower?.text).toContain('raised, level 0.006 in SI units');
  expect(blower?.text).toContain('The full text could not be composed: TypeError: no words for it');
  expect(blower?.text).toContain('Caution:');
  expect(fan?.text).toContain('DANGER 2: fan, limit:fan/de/overall');
  expect(pump?.subject).toBe('DANGER 3: pump, de, overall 6 mm/s r.m.s.');
  expect(await b.ledger.read((reader) => untoldEvents(reader, 10))).toEqual([]);
  expect(b.logged.filter((line) => line.includes('could not be composed')).length).toBe(2);
});

it('an alarm whose state cannot be read is told in plain words, and keeps no other, of a backlog too', async () => {
  const { server, b } = await bench();
  for (const machine of ['pump', 'fan'])
    await b.record(`${machine}/de`, { overall: 6 }, { fromBacklog: true });
  const other = new Database(b.ledger.path);
  other.prepare("update alarm_states set state = '{broken' where number = 1").run();
  other.close();
  await b.pass(hourMs, 10_000);
  const told = new Map(server.to(ann).map(({ subject, text }) => [subject, text]));
  expect([...told.keys()].sort()).toEqual(['Larkfen Waterworks: DANGER 1', 'Larkfen Waterworks: DANGER 2']);
  expect(told.get('Larkfen Waterworks: DANGER 1')).toContain('DANGER 1: pump, limit:pump/de/overall');
  expect(await b.ledger.read((reader) => untoldEvents(reader, 10))).toEqual([]);
});

it('a summary that cannot be made is a plain list of what stands, once that day', async () => {
  const { server, b } = await bench();
  summaryFails = true;
  await b.record('pump/de', { overall: 6 });
  await b.pass(hourMs);
  b.clock.advance(dayMs);
  expect(await b.rounds.morning()).toBe('2026-12-02');
  expect(await b.rounds.morning()).toBe(null);
  await b.pass(1_000);
  expect(server.got.length).toBe(2);
  const summary = server.to(ann)[1];
  expect(summary?.subject).toBe('Larkfen Waterworks: summary: 1 stand');
  expect(summary?.text).toContain('DANGER 1: pump, limit:pump/de/overall');
  expect(summary?.text).toContain('TypeError: no words for it');
});
