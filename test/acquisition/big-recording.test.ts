import { expect, test } from 'vitest';
import { endlessWav, streamed } from './big-recording.ts';

test('a recording of 2 GiB is read through buffers of 4 MiB', () => {
  const dataBytes = 2 ** 31;
  const { frames, mostBytes, right } = streamed(endlessWav(dataBytes, 'RIFF'));
  expect(frames).toBe(dataBytes / 2);
  expect(right).toBe(true);
  expect(mostBytes).toBeLessThan(4 * 2 ** 20);
});
