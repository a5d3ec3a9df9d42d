import { expect, it } from 'vitest';
import { Housekeeping } from '../../src/service/housekeeping.ts';
import { deliveriesOf } from '../../src/store/deliveries.ts';
import { ann, dayMs, hourMs, MailBench } from './mail-bench.ts';
import { MailServerOnLoopback } from './mail-server.ts';

it('the bytes of a mail are kept for ninety days after it was taken, its answer for ever', async () => {
  const server = await MailServerOnLoopback.start();
  const b = await MailBench.start({ port: server.port, to: [{ address: ann }] });
  const housekeeping = new Housekeeping(
    {
      ledger: b.ledger,
      view: () => b.view,
      log: b.tools().log,
      monotonicMs: () => b.clock.monotonicMs(),
      wallMs: () => b.clock.wallMs(),
    },
    false,
  );
  const kept = async (afterMs: number) => {
    b.clock.advance(afterMs);
    await housekeeping.whenIdle();
    const [delivery] = await b.ledger.read((reader) => deliveriesOf(reader, 1));
    return { state: delivery?.state, answered: delivery?.lastAnswer !== null, bytes: delivery?.bytes.length };
  };
  await b.record('blower/de', { overall: 6 });
  await b.pass(hourMs);
  const before = await kept(89 * dayMs);
  expect(before).toMatchObject({ state: 'accepted', answered: true });
  expect(before.bytes).toBeGreaterThan(1_000);
  expect(await kept(2 * dayMs)).toEqual({ state: 'accepted', answered: true, bytes: 0 });
  await housekeeping.end();
});
