/** A backlog that takes longer than a round: stop, a reload and fresh recordings need not wait for its end. */
import { expect, it } from 'vitest';
import { SteppedClock } from '../../src/service/clock.ts';
import type { Step } from '../../src/service/steps.ts';
import { beginMs, hourMs, signal, stamp, wav } from './site-on-disk.ts';
import { serviceOn, site } from './trial.ts';

const overdue = { recordings: 'overdue_after: 1000 h' };
const files = 60;

const nameOf = (hour: number) => `pump-2_${stamp(beginMs + hour * hourMs)}.wav`;

/** A backlog of the pump, let through; a decision takes a second. `atDecision`: called with its number. */
async function backlog(atDecision: (decisions: number) => void = () => {}) {
  const clock = new SteppedClock(beginMs + 100 * hourMs);
  let decisions = 0;
  const step: Step = (name) => {
    if (name !== 'intake: decision committed') return;
    clock.advance(1_000);
    atDecision(++decisions);
  };
  const on = site(overdue);
  const service = await serviceOn(on, { clock, step });
  for (let hour = files - 1; hour >= 0; hour--) service.drop(nameOf(hour), wav([signal(1, hour + 1, 512)]));
  await service.take();
  return { on, clock, service };
}

it('a round ends after twenty seconds, and the next goes on at once, in order, with what came fresh last', async () => {
  const { service } = await backlog();
  const first = await service.after(61_000);
  expect(first.taken).toBeGreaterThanOrEqual(20);
  expect(first.taken).toBeLessThan(30);
  expect(first).toMatchObject({ waiting: files - first.taken, againInMs: 0 });
  expect(first.waitingFor).toEqual(new Set(['pump-2/de-v']));
  service.drop(nameOf(100), wav([signal(1, 999, 512)]));
  const second = await service.after(0);
  expect(second.taken).toBeGreaterThanOrEqual(20);
  const third = await service.after(0);
  expect(first.taken + second.taken + third.taken).toBe(files + 1);
  expect(third.waiting).toBe(0);
  const rows = await service.rows('recordings', 'file_name, evaluated', 'order by id');
  const hours = [...Array.from({ length: files }, (_, hour) => hour), 100];
  expect(rows).toEqual(hours.map((hour) => ({ file_name: nameOf(hour), evaluated: 1 })));
});

it('a stop is heard in the middle of a backlog, and the next start takes the rest', async () => {
  let stop = () => {};
  const { on, clock, service } = await backlog((decisions) => decisions === 3 && stop());
  stop = () => service.service.askToStop();
  const { taken } = await service.after(61_000);
  expect(taken).toBeGreaterThanOrEqual(3);
  expect(taken).toBeLessThan(8);
  expect(await service.after(0)).toMatchObject({ taken: 0, waitingFor: null });
  await service.stop();
  const next = await serviceOn(on, { clock });
  await next.take();
  await next.after(61_000);
  const rows = await next.rows('recordings', 'file_name, evaluated', 'order by id');
  expect(rows).toEqual(
    Array.from({ length: files }, (_, hour) => ({ file_name: nameOf(hour), evaluated: 1 })),
  );
  expect(
    await next.rows('journal', 'reason', "where event = 'started' order by sequence desc limit 1"),
  ).toEqual([{ reason: expect.stringContaining('ended') }]);
});

it('a site file that comes into force in the middle of a backlog is asked for the rest of it', async () => {
  let reload = async () => {};
  const reloaded: Promise<unknown>[] = [];
  const { on, service } = await backlog((decisions) => decisions === 3 && reloaded.push(reload()));
  const { appendFileSync } = await import('node:fs');
  reload = async () => {
    appendFileSync(`${on.folder}/site.yaml`, '# another text\n');
    await service.service.reload();
  };
  const first = await service.after(61_000);
  await Promise.all(reloaded);
  expect(first.taken).toBeLessThan(10);
  expect(first.againInMs).toBe(0);
  const second = await service.after(0);
  expect(second.taken).toBeGreaterThanOrEqual(20);
});
