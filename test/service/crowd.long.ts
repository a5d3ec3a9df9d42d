import { expect, it } from 'vitest';
import { crowdIsTaken } from '../faults/crowd.ts';

it('ten thousand files at once are taken in, in order, each once, in bounded memory', async () => {
  await crowdIsTaken(10_000);
  const mb = Math.round(process.memoryUsage().rss / 2 ** 20);
  process.stdout.write(`rss ${mb} MB\n`);
  expect(mb).toBeLessThan(1024);
});
