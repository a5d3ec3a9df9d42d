import { afterEach, describe, expect, it } from 'vitest';
import { type PoolSettings, WorkerPool } from '../../src/manipulation/pool.ts';
import type { PoolTask } from './pool-worker.ts';

/** Real worker threads, real hangs. */
const open: WorkerPool<PoolTask, number>[] = [];
afterEach(async () => {
  for (const pool of open.splice(0)) await pool.close();
});

function poolOf(settings: Partial<PoolSettings> = {}): WorkerPool<PoolTask, number> {
  const worker = new URL('./pool-worker.ts', import.meta.url);
  const pool = new WorkerPool<PoolTask, number>({ worker, threads: 2, deadlineMs: 20_000, ...settings });
  open.push(pool);
  return pool;
}

describe('the worker pool', () => {
  it('answers every task', async () => {
    const pool = poolOf();
    const answers = await Promise.all(
      Array.from({ length: 20 }, (_, value) => pool.run({ do: 'double', value })),
    );
    expect(answers).toEqual(Array.from({ length: 20 }, (_, n) => ({ outcome: 'answer', answer: 2 * n })));
  });

  it.each([
    ['throws', { do: 'throw' }, /^thrown by the task; tried again alone: thrown by the task$/],
    ['ends its thread', { do: 'exit' }, /exited with code: 3; tried again alone/],
    [
      'never ends',
      { do: 'loop' },
      /^it did not end within 0.5 s; tried again alone: it did not end within 0.5 s$/,
    ],
  ] as const)(
    'refuses a task that %s, after one more try, and goes on with the others',
    async (_, task, reason) => {
      const pool = poolOf(task.do === 'loop' ? { deadlineMs: 500, startMs: 4000 } : {});
      await pool.run({ do: 'double', value: 1 });
      const refused = await pool.run(task);
      expect(refused).toMatchObject({ outcome: 'refused', reason: expect.stringMatching(reason) });
      expect(await pool.run({ do: 'double', value: 4 })).toEqual({ outcome: 'answer', answer: 8 });
      expect(pool.threads).toBe(2);
    },
  );

  it('refuses a task that fills its memory and goes on with the others', async () => {
    const pool = poolOf({ resourceLimits: { maxOldGenerationSizeMb: 24 } });
    expect(await pool.run({ do: 'fill-memory' })).toMatchObject({
      outcome: 'refused',
      reason: expect.stringMatching(/memory/),
    });
    expect(await pool.run({ do: 'double', value: 4 })).toEqual({ outcome: 'answer', answer: 8 });
  });

  it('tries a failed task again with no other beside it', async () => {
    const pool = poolOf();
    const counters = new SharedArrayBuffer(16);
    const tasks = Array.from({ length: 12 }, (_, n) =>
      pool.run({ do: 'note', counters, failFirst: n === 3 }),
    );
    expect((await Promise.all(tasks)).every((answer) => answer.outcome === 'answer')).toBe(true);
    const [running, together, tries, beside] = new Int32Array(counters);
    expect({ running, together, tries, beside }).toEqual({ running: 0, together: 2, tries: 2, beside: 0 });
  });

  it('counts a worker off that cannot be ended, and says so when the last is lost', async () => {
    const told: string[] = [];
    const pool = poolOf({ deadlineMs: 300, lostAfterMs: 100, onAllLost: (reason) => told.push(reason) });
    // Both threads have loaded.
    await Promise.all([pool.run({ do: 'double', value: 1 }), pool.run({ do: 'double', value: 2 })]);
    const answers = await Promise.all([
      pool.run({ do: 'hang-in-the-system' }),
      pool.run({ do: 'hang-in-the-system' }),
    ]);
    expect(answers.map((answer) => answer.outcome)).toEqual(['no-worker', 'no-worker']);
    expect(pool.threads).toBe(0);
    expect(told).toEqual(['all 2 worker threads hang and could not be ended; restart the service']);
    expect(await pool.run({ do: 'double', value: 1 })).toMatchObject({ outcome: 'no-worker' });
  });

  it('does not lose a thread that was still loading at its deadline', async () => {
    const pool = poolOf({ deadlineMs: 1, startMs: 0, lostAfterMs: 60_000 });
    expect(await pool.run({ do: 'loop' })).toMatchObject({ outcome: 'refused' });
    expect(pool.threads).toBe(2);
  });

  it('answers what is left when it is closed', async () => {
    const pool = poolOf({ threads: 1 });
    const left = [pool.run({ do: 'loop' }), pool.run({ do: 'double', value: 1 })];
    await pool.close();
    for (const answer of await Promise.all(left)) {
      expect(answer).toEqual({ outcome: 'no-worker', reason: 'the worker pool was closed' });
    }
  });
});
