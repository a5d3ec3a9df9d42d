import { expect } from 'vitest';
import { beginMs, stamp, wav } from '../service/site-on-disk.ts';
import { trial } from '../service/trial.ts';

const minuteMs = 60_000;
const everyMinute = 'recordings:\n  expected_every: 1 min';

/** That many files lie in the drop folder at once: they are taken in one round, in the order of their starts. */
export async function crowdIsTaken(files: number): Promise<void> {
  const service = await trial({ press: everyMinute, pump: everyMinute }, { threads: 2 });
  const [one, two] = [wav([1, 1], 1), wav([1], 2)];
  for (let n = 0; n < files / 2; n++) {
    const at = stamp(beginMs + n * minuteMs);
    service.drop(`press-1_${at}.wav`, one);
    service.drop(`pump-2_${at}.wav`, two);
  }
  service.clock.advance((files / 2) * minuteMs);
  await service.take();
  const begunMs = performance.now();
  expect(await service.after(minuteMs)).toMatchObject({ taken: files, waiting: 0, unfiled: 0 });
  const seconds = (performance.now() - begunMs) / 1000;
  process.stdout.write(`${files} files in ${seconds.toFixed(1)} s\n`);
  expect(service.files('drop')).toEqual([]);
  expect(service.files('data', 'archive')).toHaveLength(files);
  const order = await service.rows('recordings', 'used_ms', 'order by id');
  const used = order.map(({ used_ms }) => used_ms as number);
  expect(used).toEqual([...used].sort((a, b) => a - b));
}
