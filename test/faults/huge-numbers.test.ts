/** Numbers that are finite and yet none that a sensor gives: float files spoilt in an exponent, sidecars of absurd scale. */
import { describe, expect, it } from 'vitest';
import { wavFile } from '../acquisition/wav-writer.ts';
import { beginMs, frames, sampleRateHz, signal, stamp } from '../service/site-on-disk.ts';
import { trial } from '../service/trial.ts';

function floatWav(samples: Float64Array): Uint8Array {
  const data = new Uint8Array(samples.buffer, samples.byteOffset, samples.byteLength);
  return wavFile({ code: 3, bits: 64, rateHz: sampleRateHz, data });
}

const silentButForTheEnd = new Float64Array(frames);
silentButForTheEnd.fill(1, frames - 12, frames - 4);

describe('a recording of numbers that no sensor gives', () => {
  it.each([
    ['nothing but 1e300', new Float64Array(frames).fill(1e300)],
    ['one sample of 1e200 in a good recording', signal(1, 3).map((value, n) => (n === 700 ? 1e200 : value))],
    ['samples of 1e-300', signal(1e-300, 3)],
    ['silence but for the last few samples', silentButForTheEnd],
  ])('%s: is taken, and the service goes on', async (_, samples) => {
    const service = await trial();
    const name = `pump-2_${stamp(beginMs)}.wav`;
    service.toHour(0);
    service.drop(name, floatWav(samples));
    expect(await service.take()).toMatchObject({ taken: 1 });
    expect(await service.outcomes()).toMatchObject({ [name]: expect.stringMatching(/^taken/) });
    expect(await service.hour(1)).toMatchObject({ taken: 2 });
  });

  it('by a sidecar of absurd scale or speed: the same', async () => {
    const service = await trial();
    const odd = ['{"channels":{"1":{"full_scale":1.7e308}}}', '{"speed_rpm":1e-320}'];
    for (const [hour, sidecar] of odd.entries()) {
      const name = `pump-2_${stamp(beginMs + hour * 3_600_000)}`;
      service.toHour(hour);
      service.drop(`${name}.json`, sidecar);
      service.drop(`${name}.wav`, floatWav(signal(1, hour)));
      await service.take();
      expect(await service.outcomes()).toMatchObject({ [`${name}.wav`]: expect.stringMatching(/^taken/) });
    }
  });
});
