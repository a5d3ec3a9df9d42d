import { spawn } from 'node:child_process';
import { once } from 'node:events';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { expect } from 'vitest';
import { noStep, type StepName } from '../../src/service/steps.ts';
import { mayRepeatMails } from './interrupted.ts';
import { playStory } from './story.ts';
import { storyRun, undisturbedRun } from './story-run.ts';

const child = fileURLToPath(new URL('./story-child.ts', import.meta.url));

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

/** The story is killed at the n-th time that it reaches the step, and then ends as one that nobody interrupted. */
export async function killedAndStartedAgain(step: StepName, shelf: string | null, n: number): Promise<void> {
  const whole = await undisturbedRun(shelf);
  const run = await storyRun(shelf);
  const ended = await playInChild(run.folder, step, n);
  expect(ended).toMatchObject({ signal: 'SIGKILL', said: '' });
  await playStory(run.folder, noStep);
  expect(run.state()).toEqual(whole.state);
  const received = run.received();
  const twice = received.length - new Set(received).size;
  expect(twice).toBe(mayRepeatMails.includes(step) ? 1 : 0);
}
