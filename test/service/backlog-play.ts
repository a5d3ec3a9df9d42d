import { expect } from 'vitest';
import { seededNoise } from '../../src/cli/demo/noise.ts';
import { SteppedClock } from '../../src/service/clock.ts';
import { beginMs, hourMs, signal, stamp, type TrialService, wav } from './site-on-disk.ts';
import { trial } from './trial.ts';

const patient = { recordings: 'overdue_after: 1000 h' };

interface Hourly {
  readonly name: string;
  readonly atMs: number;
  readonly bytes: Uint8Array;
}

/** Both machines, every hour for so many days, with alarms that come, rise, go and stand at the end. */
function recordings(days: number): Hourly[] {
  const files: Hourly[] = [];
  for (let hour = 0; hour < 24 * days; hour++) {
    const atMs = beginMs + hour * hourMs;
    const press = hour % 50 > 30 && hour % 50 < 40 ? 5 : 1;
    const pump = hour > 24 * days - 6 ? 9 : hour % 37 < 3 ? 5 : 1;
    const tone = (level: number, seed: number) => signal(level, seed, 512);
    files.push(
      { name: `press-1_${stamp(atMs)}.wav`, atMs, bytes: wav([tone(press, 2 * hour), tone(1, 3 * hour)]) },
      { name: `pump-2_${stamp(atMs)}.wav`, atMs, bytes: wav([tone(pump, 5 * hour)]) },
    );
  }
  return files;
}

interface Story {
  readonly journal: readonly unknown[];
  readonly standing: readonly string[];
  readonly levels: readonly unknown[];
}

/** Alarms as the journal tells them: point, limit, event, used time. */
async function storyOf(service: TrialService): Promise<Story> {
  return {
    journal: await service.rows(
      'journal',
      'key, event, before, after, used_ms',
      "where key like 'limit:%' order by key, sequence",
    ),
    standing: (await service.standing()).filter((line) => !line.startsWith('overdue')),
    levels: await service.rows('levels', 'point_id, used_ms, level', 'order by point_id, used_ms, band_id'),
  };
}

async function live(files: readonly Hourly[]): Promise<Story> {
  const service = await trial(patient);
  for (const { name, atMs, bytes } of files) {
    service.clock.advance(Math.max(0, atMs + 10_000 - service.clock.wallMs()));
    service.drop(name, bytes);
    if (name.startsWith('press')) continue;
    expect(await service.take()).toMatchObject({ taken: 2, waiting: 0 });
  }
  const story = await storyOf(service);
  await service.stop();
  return story;
}

/** All of it at once, in an order of its own, over half a minute; decided only when it is quiet. */
async function atOnce(files: readonly Hourly[], seed: number): Promise<Story> {
  const last = files.at(-1) as Hourly;
  const service = await trial(patient, { clock: new SteppedClock(last.atMs + 10_000) });
  const noise = seededNoise(seed);
  const shuffled = files.map((file) => ({ file, at: noise.gaussian() })).sort((a, b) => a.at - b.at);
  const part = Math.ceil(files.length / 3);
  for (let n = 0; n < shuffled.length; n += part) {
    for (const { file } of shuffled.slice(n, n + part)) service.drop(file.name, file.bytes);
    expect(await service.after(10_000)).toMatchObject({ taken: 0 });
  }
  await service.after(6_000);
  const begunMs = performance.now();
  for (let n = 0; n < 10 && service.files('drop').length > 0; n++) await service.after(30_000);
  process.stdout.write(
    `${files.length} files at once in ${((performance.now() - begunMs) / 1000).toFixed(1)} s, rss ${Math.round(process.memoryUsage().rss / 2 ** 20)} MB\n`,
  );
  expect(await service.rows('recordings', 'count(*) as n, sum(evaluated) as evaluated')).toEqual([
    { n: files.length, evaluated: files.length },
  ]);
  return storyOf(service);
}

/** Days of recordings that arrive at once tell the same story as they would have told live. */
export async function sameAsLive(days: number, seed: number): Promise<void> {
  const files = recordings(days);
  const expected = await live(files);
  expect(expected.journal.length).toBeGreaterThan(4);
  expect(expected.standing).toContain('overall-fixed-upper pump-2/de-v danger');
  expect(await atOnce(files, seed)).toEqual(expected);
}
