import { spawn } from 'node:child_process';
import { once } from 'node:events';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { fileURLToPath } from 'node:url';
import { expect } from 'vitest';
import { noStep, type StepName } from '../../src/service/steps.ts';
import { mayRepeatMails, someRepeatMails } from './interrupted.ts';
import { playStory } from './story.ts';
import { storyRun, undisturbedRun } from './story-run.ts';

const child = fileURLToPath(new URL('./story-child.ts', import.meta.url));

/** Resolves to how the process ended. */
export function playInChild(folder: string, step: StepName, n: number, program: 'this' | 'newer' = 'this') {
  return howItEnds(child, [folder, step, String(n), program]);
}

/** Runs a module as a process of its own. */
export async function howItEnds(module: string, args: readonly string[]) {
  const process_ = spawn(process.execPath, [module, ...args], {
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
  if (someRepeatMails.includes(step)) expect(twice).toBeLessThanOrEqual(1);
  else expect(twice).toBe(mayRepeatMails.includes(step) ? 1 : 0);
}
