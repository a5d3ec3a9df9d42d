/**
 * The real service, in a process of its own, is killed at every named step of intake, filing and delivery, and started
 * again: nothing is lost and nothing is told twice. What is compared stands in story-state.ts.
 */
import { spawn } from 'node:child_process';
import { once } from 'node:events';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { afterAll, describe, expect, it } from 'vitest';
import { noStep, type StepName, stepNames } from '../../src/service/steps.ts';
import { interruptions, leftOut, mayRepeatMails } from './interrupted.ts';
import { playStory } from './story.ts';
import { otherFileSystem, removeTemplate, storyRun, undisturbedRun } from './story-run.ts';

const child = fileURLToPath(new URL('./story-child.ts', import.meta.url));
afterAll(removeTemplate);

/** Resolves to how the process ended. */
async function playInChild(folder: string, step: StepName, n: number) {
  const process_ = spawn(process.execPath, [child, folder, step, String(n)], {
    stdio: ['ignore', 'pipe', 'pipe'],
    env: { ...process.env, NODE_COMPILE_CACHE: join(tmpdir(), 'humledger-compiled') },
  });
  let said = '';
  process_.stderr.on('data', (part) => {
    said += part;
  });
  const [code, signal] = await once(process_, 'exit');
  return { code, signal, said };
}

describe('a story that nobody interrupts', () => {
  it('reaches every step, and leaves what its files say', async () => {
    const { steps, state } = await undisturbedRun(null);
    const across = otherFileSystem === null ? null : await undisturbedRun(otherFileSystem);
    const reached = stepNames.filter((name) => steps.has(name) || across?.steps.has(name));
    const excused = leftOut.map((text) => text.slice(0, text.lastIndexOf(':')));
    expect([...reached, ...excused].sort()).toEqual([...stepNames].sort());
    expect(state.ledger.recordings).toHaveLength(9);
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
    const whole = await undisturbedRun(shelf);
    const total = whole.steps.get(step) ?? 0;
    const run = await storyRun(shelf);
    const ended = await playInChild(run.folder, step, Math.ceil(total / 2));
    expect(ended).toMatchObject({ signal: 'SIGKILL', said: '' });
    await playStory(run.folder, noStep);
    expect(run.state()).toEqual(whole.state);
    const received = run.received();
    const twice = received.length - new Set(received).size;
    expect(twice).toBe(mayRepeatMails.includes(step) ? 1 : 0);
  });
});
