import { lstatSync, readFileSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import { setFlagsFromString } from 'node:v8';
import { runInNewContext } from 'node:vm';
import { expect } from 'vitest';
import { noteSeen } from '../../src/store/intake-marks.ts';
import {
  beginMs,
  hourMs,
  makeSite,
  type SiteOnDisk,
  signal,
  stamp,
  TrialService,
  wav,
} from './site-on-disk.ts';

const rowsAtOnce = 1000;
/** What is left afterwards is what is held. */
function collectGarbage(): void {
  setFlagsFromString('--expose-gc');
  (runInNewContext('gc') as () => void)();
}

const countingWorker = new URL('./counting-worker.ts', import.meta.url);

/** Files that the service opened since the last look, in order. */
export function opened(folder: string): string[] {
  try {
    const lines = readFileSync(join(folder, 'opened'), 'utf8').split('\n').filter(Boolean);
    writeFileSync(join(folder, 'opened'), '');
    return lines;
  } catch {
    return [];
  }
}

/**
 * A drop folder in which so many files lie that the ledger knows, some of them changed since, and some new ones: only the
 * changed and the new are opened. Says what a sweep takes and holds.
 */
export async function manyKept(files: number, changed: number): Promise<void> {
  const on = makeSite({ folders: 'after_reading: keep', recordings: 'overdue_after: 8000 h' });
  try {
    await keptOn(on, files, changed);
  } finally {
    // Here and not after the test: to remove so many files takes its time.
    on.remove();
  }
}

async function keptOn(on: SiteOnDisk, files: number, changed: number): Promise<void> {
  const first = await TrialService.start(on);
  const names = Array.from({ length: files }, (_, n) => `pump-2_${stamp(beginMs - n * hourMs)}.wav`);
  for (const name of names) writeFileSync(join(on.drop, name), 'read long ago');
  for (let n = 0; n < files; n += rowsAtOnce)
    await first.service.ledger.transact(async (writer) => {
      for (const path of names.slice(n, n + rowsAtOnce)) {
        const { size, mtimeMs, ctimeMs } = lstatSync(join(on.drop, path));
        await noteSeen(writer, { path, sizeBytes: size, mtimeMs, ctimeMs, recordingId: null });
      }
    });
  await first.stop();

  const service = await TrialService.start(on, { worker: countingWorker });
  await service.after(0);
  collectGarbage();
  const before = process.memoryUsage();
  const begunMs = performance.now();
  for (let n = 0; n < 5; n++) expect(await service.after(10_000)).toMatchObject({ taken: 0, setAside: 0 });
  const sweepMs = (performance.now() - begunMs) / 5;
  collectGarbage();
  const held = process.memoryUsage();
  expect(opened(on.folder)).toEqual([]);

  const touched = names.filter((_, n) => n % Math.floor(files / changed) === 1).slice(0, changed);
  touched.forEach((name, n) => {
    writeFileSync(join(on.drop, name), wav([signal(1, n + 1, 512)]));
  });
  service.drop(`pump-2_${stamp(beginMs + hourMs)}.wav`, wav([signal(1, 999, 512)]));
  await service.take();
  await service.after(61_000);
  await service.after(10_000);
  const wanted = [...touched, `pump-2_${stamp(beginMs + hourMs)}.wav`].sort();
  const seen = opened(on.folder);
  for (const task of ['header', 'measure'])
    expect(
      seen
        .filter((line) => line.startsWith(task))
        .map((line) => line.split(' ')[1])
        .sort(),
    ).toEqual(wanted);
  await service.stop();
  const mb = (bytes: number) => Math.round(bytes / 2 ** 20);
  process.stdout.write(
    `${files} kept files: a round ${sweepMs.toFixed(0)} ms, heap ${mb(held.heapUsed)} MB (${mb(before.heapUsed)} before), rss ${mb(held.rss)} MB\n`,
  );
}
