import fc from 'fast-check';
import { expect, it } from 'vitest';
import { deeds, promisesHold } from './arrivals-play.ts';

it('a thousand stories of loggers at their worst: no point blind, no exceedance silent', async () => {
  const seen = { files: 0, late: 0, clockTroubles: 0 };
  await fc.assert(
    fc.asyncProperty(deeds, (all) => promisesHold(all, seen)),
    { seed: 20261203, numRuns: 1000, endOnFailure: true },
  );
  process.stdout.write(`${JSON.stringify(seen)}\n`);
  expect(seen.late).toBeGreaterThan(0);
});
