import { basename } from 'node:path';
import type { RecordingTask } from '../../src/service/recording-task.ts';
import work from '../../src/service/recording-worker.ts';

/** The real worker, but for files whose names say what shall happen to it while it reads their samples. */
export default function poisoned(task: RecordingTask): ReturnType<typeof work> {
  const name = typeof task.path === 'string' ? basename(task.path) : '';
  const when = name.includes('header') ? 'header' : 'measure';
  if (task.task !== when) return work(task);
  if (name.includes('crash')) process.exit(7);
  if (name.includes('throw')) throw new Error('thrown over this file');
  if (name.includes('hang')) for (;;);
  if (name.includes('late')) {
    setImmediate(() => {
      throw new Error('thrown late');
    });
    return new Promise(() => {});
  }
  if (name.includes('after')) {
    setTimeout(() => {
      throw new Error('thrown after its answer');
    }, 20);
  }
  if (name.includes('fill')) {
    const kept: unknown[][] = [];
    for (;;) kept.push(new Array(2_000_000).fill(kept));
  }
  return work(task);
}
