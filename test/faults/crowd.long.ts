import { it } from 'vitest';
import { crowdIsTaken } from './crowd.ts';

it('a drop folder with 2,000 files at once is taken in, in order, each once', () => crowdIsTaken(2000));
