/** A recording larger than the memory that may be used for it goes through the real service in blocks. */
import { closeSync, openSync, statfsSync, writeSync } from 'node:fs';
import { tmpdir } from 'node:os';
import { join } from 'node:path';
import { describe, expect, it } from 'vitest';
import { wavFile } from '../acquisition/wav-writer.ts';
import { beginMs, stamp } from '../service/site-on-disk.ts';
import { trial } from '../service/trial.ts';

const samplesBytes = 2 ** 30;
const blockBytes = 2 ** 20;
const disk = statfsSync(tmpdir());
const hasRoom = disk.bavail * disk.bsize > 2 * samplesBytes;
const room = hasRoom ? '' : ' (left out: less than 2 GiB of disk)';

describe('a recording of 1 GiB', () => {
  it.skipIf(!hasRoom)(`is taken with the memory of the process bounded${room}`, async () => {
    const service = await trial({}, { deadlineMs: 1_200_000 });
    const name = `pump-2_${stamp(beginMs)}.wav`;
    const file = openSync(join(service.site.drop, name), 'w');
    const head = wavFile({
      rateHz: 2560,
      data: new Uint8Array(0),
      dataSize: samplesBytes,
      riffSize: samplesBytes + 36,
    });
    writeSync(file, head);
    const tone = Int16Array.from(
      { length: blockBytes / 2 },
      (_, n) => 600 * Math.sin((2 * Math.PI * n) / 12.8),
    );
    for (let written = 0; written < samplesBytes; written += blockBytes)
      writeSync(file, new Uint8Array(tone.buffer));
    closeSync(file);
    service.clock.advance(10_000);
    await service.after(0);
    const before = process.memoryUsage().rss;
    let most = 0;
    const watch = setInterval(() => {
      most = Math.max(most, process.memoryUsage().rss);
    }, 50);
    const begun = performance.now();
    await service.after(6_000);
    clearInterval(watch);
    process.stdout.write(
      `1 GiB in ${((performance.now() - begun) / 1000).toFixed(1)} s, ${(before / 2 ** 20).toFixed(0)} MiB before, at most ${(most / 2 ** 20).toFixed(0)} MiB\n`,
    );
    expect(await service.outcomes()).toEqual({ [name]: 'taken' });
    expect(most - before).toBeLessThan(250 * 2 ** 20);
    expect(await service.rows('levels', 'count(*) as n')).toEqual([{ n: 1 }]);
    expect(service.files('data', 'archive')).toHaveLength(1);
  });
});
