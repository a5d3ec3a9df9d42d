/**
 * The same story, broken off by an error at every named step: the service ends in order, is started again, and everything
 * is as if nothing had happened.
 */
import { afterAll, describe, expect, it } from 'vitest';
import { noStep } from '../../src/service/steps.ts';
import { interruptions, mayRepeatMails } from './interrupted.ts';
import { at, playStory } from './story.ts';
import { removeTemplate, storyRun, undisturbedRun } from './story-run.ts';

afterAll(removeTemplate);

class Broken extends Error {}

describe('a service that breaks with an error', () => {
  it.each(interruptions)('at "$title" ends where an undisturbed one ends', async ({ step, shelf }) => {
    const whole = await undisturbedRun(shelf);
    const run = await storyRun(shelf);
    const breaks = at(step, Math.ceil((whole.steps.get(step) ?? 0) / 2), () => {
      throw new Broken(step);
    });
    await expect(playStory(run.folder, breaks)).rejects.toThrow(Broken);
    await playStory(run.folder, noStep);
    expect(run.state()).toEqual(whole.state);
    const received = run.received();
    expect(received.length - new Set(received).size).toBe(mayRepeatMails.includes(step) ? 1 : 0);
  });
});
