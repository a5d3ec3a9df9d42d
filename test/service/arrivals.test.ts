/** The promise of the clock rules, over random arrivals: no point is blind while files come, no exceedance is silent. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { deeds, promisesHold } from './arrivals-play.ts';

const seed = 20261201;

describe('whatever loggers do', () => {
  it('a file is taken once, one is judged in every overdue span, and no exceedance is silent', async () => {
    const seen = { files: 0, late: 0, clockTroubles: 0 };
    await fc.assert(
      fc.asyncProperty(deeds, (all) => promisesHold(all, seen)),
      { seed, numRuns: 15, endOnFailure: true },
    );
    expect(seen.files).toBeGreaterThan(300);
    expect(seen.late).toBeGreaterThan(30);
    expect(seen.clockTroubles).toBeGreaterThan(12);
  }, 180_000);
});
