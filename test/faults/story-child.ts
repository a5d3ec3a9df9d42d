import type { StepName } from '../../src/service/steps.ts';
import { newerMigrations } from './older-ledger.ts';
import { at, playStory } from './story.ts';

/**
 * Plays the story as a process of its own, and ends itself the hardest way at the n-th time of a step. With `newer` the
 * ledger is brought up to what the next version of the program might ask.
 */
const [folder = '', step = '', n = '1', program = ''] = process.argv.slice(2);
await playStory(
  folder,
  at(step as StepName, Number(n), () => process.kill(process.pid, 'SIGKILL')),
  program === 'newer' ? { migrations: newerMigrations } : {},
);
process.stdout.write('ended by itself\n');
