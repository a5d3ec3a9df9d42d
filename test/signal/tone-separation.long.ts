/** Two tones at every distance up to eight lines: from the stated one on they are told apart, nearer they are not. */
import { describe, expect, it } from 'vitest';
import { toneSeparation } from '../../src/signal/tone-separation.ts';
import { windowNames } from '../../src/signal/window.ts';
import { seededRandom } from './random.ts';
import { toldApart } from './tone-separation-trials.ts';

const trials = 100;

describe.each(windowNames.filter((name) => name !== 'rectangular'))('%s', (window) => {
  it.each([
    ['equal', 0],
    ['20 dB unequal', 20],
  ] as const)(
    '%s',
    (_, db) => {
      const stated = toneSeparation(window);
      if (stated === null) throw new Error(`${window} separates nothing`);
      const from = db === 0 ? stated.equalLines : stated.unequalLines;
      const random = seededRandom(20261201);
      let surely = Number.POSITIVE_INFINITY;
      for (let lines = 8; lines >= 1.5; lines -= 0.5) {
        const shares = [1, 2, 5, 11].map((averages) =>
          toldApart(window, { lines, db, averages }, random, trials),
        );
        const least = Math.min(...shares);
        if (lines >= from)
          expect(least, `${lines} lines: ${shares.join(', ')} of 100`).toBeGreaterThanOrEqual(95);
        if (least >= 95 && surely === lines + 0.5) surely = lines;
        else if (lines === 8) surely = 8;
      }
      // Not stated wider than need be: half a line nearer, some averages and places fail.
      expect(surely).toBeLessThanOrEqual(from);
      expect(surely).toBeGreaterThanOrEqual(from - 0.5);
    },
    300_000,
  );
});
