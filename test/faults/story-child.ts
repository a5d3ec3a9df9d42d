import type { StepName } from '../../src/service/steps.ts';
import { at, playStory } from './story.ts';

/** Plays the story as a process of its own, and ends itself the hardest way at the n-th time of a step. */
const [folder = '', step = '', n = '1'] = process.argv.slice(2);
await playStory(
  folder,
  at(step as StepName, Number(n), () => process.kill(process.pid, 'SIGKILL')),
);
process.stdout.write('ended by itself\n');
