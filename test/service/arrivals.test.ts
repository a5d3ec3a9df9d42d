/** The promise of the clock rules, over random arrivals: no point is blind while files come, no exceedance is silent. */
import fc from 'fast-check';
import { describe, expect, it } from 'vitest';
import { ArrivalsPlay, type Deed, deeds } from './arrivals-play.ts';
import { makeSite } from './site-on-disk.ts';

const seed = 20261201;

describe('whatever loggers do', () => {
  it('a file is taken once, one is judged in every overdue span, and no exceedance is silent', async () => {
    const seen = { files: 0, late: 0, clockTroubles: 0 };
    await fc.assert(
      fc.asyncProperty(deeds, async (all: Deed[]) => {
        const site = makeSite({ folders: 'after_reading: delete' });
        const play = await ArrivalsPlay.on(site);
        try {
          await play.play(all);
          const { files, late, clockTroubles } = await play.check();
          seen.files += files;
          seen.late += late;
          seen.clockTroubles += clockTroubles;
        } finally {
          await play.end();
          site.remove();
        }
      }),
      { seed, numRuns: 25, endOnFailure: true },
    );
    process.stdout.write(`${JSON.stringify(seen)}\n`);
    expect(seen.late).toBeGreaterThan(0);
    expect(seen.clockTroubles).toBeGreaterThan(0);
  }, 300_000);
});
