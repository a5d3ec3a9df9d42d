import { expect, test } from 'vitest';
import { endlessWav, streamed } from './big-recording.ts';

test('an RF64 recording of 6 GiB, beyond what 32 bits can say, is read through buffers of 4 MiB', () => {
  const dataBytes = 6 * 2 ** 30;
  const { frames, mostBytes, right } = streamed(endlessWav(dataBytes, 'RF64'));
  expect(frames).toBe(dataBytes / 2);
  expect(right).toBe(true);
  expect(mostBytes).toBeLessThan(4 * 2 ** 20);
});
