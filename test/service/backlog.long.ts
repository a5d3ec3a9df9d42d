import { it } from 'vitest';
import { sameAsLive } from './backlog-play.ts';

it('90 days of recordings at once, in random order, tell the same story as live', () =>
  sameAsLive(90, 20261202));
