import { appendFileSync } from 'node:fs';
import { basename, dirname, join } from 'node:path';
import type { RecordingAnswer, RecordingTask } from '../../src/service/recording-task.ts';
import work from '../../src/service/recording-worker.ts';

/** The usual worker, which notes in `opened` beside the drop folder which files it opens. */
export default function count(task: RecordingTask): Promise<RecordingAnswer> {
  const path = String(task.path);
  appendFileSync(join(dirname(dirname(path)), 'opened'), `${task.task} ${basename(path)}\n`);
  return work(task);
}
