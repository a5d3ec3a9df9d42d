/** As kill.test.ts, but at every time that the story reaches a step, not at one. */
import { afterAll, describe, it } from 'vitest';
import { interruptions } from './interrupted.ts';
import { killedAndStartedAgain } from './killed.ts';
import { removeTemplate, undisturbedRun } from './story-run.ts';

afterAll(removeTemplate);

describe('a service that is killed at any time', () => {
  it.each(interruptions)('of "$title" ends where an undisturbed one ends', async ({ step, shelf }) => {
    const { steps } = await undisturbedRun(shelf);
    for (let n = 1; n <= (steps.get(step) ?? 0); n++) await killedAndStartedAgain(step, shelf, n);
  });
});
