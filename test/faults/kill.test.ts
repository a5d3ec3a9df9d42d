/**
 * The real service, in a process of its own, is killed at every named step of intake, filing and delivery, and started
 * again: nothing is lost and nothing is told twice. What is compared stands in story-state.ts.
 */
import { afterAll, describe, expect, it } from 'vitest';
import { stepNames } from '../../src/service/steps.ts';
import { interruptions, leftOut } from './interrupted.ts';
import { killedAndStartedAgain } from './killed.ts';
import { otherFileSystem, removeTemplate, undisturbedRun } from './story-run.ts';

afterAll(removeTemplate);

describe('a story that nobody interrupts', () => {
  it('reaches every step, and leaves what its files say', async () => {
    const { steps, state } = await undisturbedRun(null);
    const across = otherFileSystem === null ? null : await undisturbedRun(otherFileSystem);
    const reached = stepNames.filter((name) => steps.has(name) || across?.steps.has(name));
    const excused = leftOut.map((text) => text.slice(0, text.lastIndexOf(':')));
    expect([...reached, ...excused].sort()).toEqual([...stepNames].sort());
    expect(state.ledger.recordings).toHaveLength(9);
    expect(state.ledger.measurements).toContainEqual(expect.objectContaining({ pooled_recordings: 2 }));
    expect(state.ledger.lives).toMatchObject([
      { key: expect.stringContaining('unreadable') },
      { key: expect.stringContaining('unassigned') },
      { key: expect.stringContaining('press-1/de-h/overall'), severity: 'danger' },
    ]);
    expect(state.mails.length).toBeGreaterThan(3);
    expect(state.ledger.deliveries).toHaveLength(state.mails.length);
    expect(across?.state.files ?? state.files).toEqual(state.files);
  });

  it.skipIf(leftOut.length > 0)(
    `has no step that is left out here${leftOut.map((text) => `; ${text}`).join('')}`,
    () => {
      expect(interruptions.map(({ step }) => step)).toEqual(expect.arrayContaining([...stepNames]));
    },
  );
});

describe('a service that is killed', () => {
  it.each(interruptions)('at "$title" ends where an undisturbed one ends', async ({ step, shelf }) => {
    const { steps } = await undisturbedRun(shelf);
    await killedAndStartedAgain(step, shelf, Math.ceil((steps.get(step) ?? 0) / 2));
  });
});
