import { execFileSync } from 'node:child_process';
import { setTimeout as wait } from 'node:timers/promises';

export type PoolTask =
  | { readonly do: 'double'; readonly value: number }
  | { readonly do: 'throw' | 'exit' | 'loop' | 'fill-memory' | 'hang-in-the-system' }
  | { readonly do: 'note'; readonly counters: SharedArrayBuffer; readonly failFirst: boolean };

/** What a worker thread may do to the pool; run as a real worker by its test. */
export default async function work(task: PoolTask): Promise<number> {
  switch (task.do) {
    case 'double':
      return 2 * task.value;
    case 'throw':
      throw new Error('thrown by the task');
    case 'exit':
      process.exit(3);
      break;
    case 'loop':
      for (;;);
    case 'fill-memory': {
      const kept: number[][] = [];
      for (;;) kept.push(Array.from({ length: 100_000 }, (_, n) => n + Math.random()));
    }
    case 'hang-in-the-system':
      // A blocking call into the system: a thread inside it cannot be ended from outside.
      execFileSync('sleep', ['3']);
      return 0;
    case 'note':
      return note(task.counters, task.failFirst);
  }
  return 0;
}

/** Counters: 0 tasks running now, 1 most that ran together, 2 tries of the failing task, 3 most beside its second try. */
async function note(shared: SharedArrayBuffer, failFirst: boolean): Promise<number> {
  const counters = new Int32Array(shared);
  const now = Atomics.add(counters, 0, 1) + 1;
  if (now > Atomics.load(counters, 1)) Atomics.store(counters, 1, now);
  try {
    if (failFirst && Atomics.add(counters, 2, 1) === 0) throw new Error('the first time only');
    await wait(20);
    const beside = Atomics.load(counters, 0) - 1;
    if (failFirst && beside > Atomics.load(counters, 3)) Atomics.store(counters, 3, beside);
    return now;
  } finally {
    Atomics.sub(counters, 0, 1);
  }
}
