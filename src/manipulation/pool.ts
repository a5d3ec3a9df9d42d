/**
 * Worker threads that may fail. A task has a deadline; past it the worker is ended. A task whose worker threw, ended,
 * ran out of memory or passed its deadline is tried once more with no other task beside it (two large recordings at
 * a time may be what was too much), then refused. A worker that does not end within `lostAfterMs` of being told
 * so is stuck in the system, holds its memory and is lost: it is counted off and not replaced. When the last is lost
 * the pool says so, and answers everything with that.
 *
 *     queued -> running -> answer
 *                  | failed: queued alone -> running alone -> answer
 *                                                | failed: refused
 *
 * resourceLimits bound the JavaScript heap only, not typed arrays; tasks must bound those themselves.
 */
import type { ResourceLimits, Worker } from 'node:worker_threads';
import { Piscina } from 'piscina';

export interface PoolSettings {
  /** Module whose default export takes a task and gives its answer. */
  readonly worker: URL;
  readonly threads: number;
  /** Longest time for one try. */
  readonly deadlineMs: number;
  /** So much more for a thread that has not answered yet: it may still be loading. Default 10 s. */
  readonly startMs?: number;
  /** Default 5 s. */
  readonly lostAfterMs?: number;
  readonly resourceLimits?: ResourceLimits;
  /** Called once, when no worker is left. */
  readonly onAllLost?: (reason: string) => void;
}

export type PoolAnswer<Answer> =
  | { readonly outcome: 'answer'; readonly answer: Answer }
  /** It failed twice, the second time alone. */
  | { readonly outcome: 'refused'; readonly reason: string }
  /** There is no worker left, or the pool was closed; says nothing about the task. */
  | { readonly outcome: 'no-worker'; readonly reason: string };

interface Job<Task, Answer> {
  readonly task: Task;
  readonly settle: (answer: PoolAnswer<Answer>) => void;
  /** Why the first try failed; null before. */
  failed: string | null;
}

type Try<Answer> = { readonly answer: Answer } | { readonly failed: string };

const usualLimits: ResourceLimits = {
  maxOldGenerationSizeMb: 512,
  maxYoungGenerationSizeMb: 64,
  stackSizeMb: 4,
};
const usualLostAfterMs = 5000;
const usualStartMs = 10_000;

export class WorkerPool<Task, Answer> {
  readonly #settings: PoolSettings;
  readonly #idle: Slot[];
  readonly #all: Set<Slot>;
  #queue: Job<Task, Answer>[] = [];
  #alone: Job<Task, Answer>[] = [];
  #running = 0;
  #runningAlone = false;
  #ended: string | null = null;

  constructor(settings: PoolSettings) {
    this.#settings = settings;
    this.#idle = Array.from({ length: Math.max(1, settings.threads) }, () => new Slot(settings));
    this.#all = new Set(this.#idle);
  }

  /** Workers that are not lost. */
  get threads(): number {
    return this.#all.size;
  }

  /** Runs a task; never rejects. Tasks begin in the order in which they were given. */
  run(task: Task): Promise<PoolAnswer<Answer>> {
    return new Promise((settle) => {
      this.#queue.push({ task, settle, failed: null });
      this.#next();
    });
  }

  /** Ends all workers; what was not answered yet gets 'no-worker'. */
  async close(): Promise<void> {
    this.#end('the worker pool was closed');
    await Promise.all([...this.#all].map((slot) => slot.close()));
  }

  #next(): void {
    if (this.#ended !== null) {
      for (const job of [...this.#queue, ...this.#alone])
        job.settle({ outcome: 'no-worker', reason: this.#ended });
      this.#queue = [];
      this.#alone = [];
      return;
    }
    while (!this.#runningAlone && this.#idle.length > 0) {
      const alone = this.#alone.length > 0;
      if (alone && this.#running > 0) return;
      const job = alone ? this.#alone.shift() : this.#queue.shift();
      if (job === undefined) return;
      this.#runningAlone = alone;
      void this.#start(job, this.#idle.pop() as Slot);
    }
  }

  async #start(job: Job<Task, Answer>, slot: Slot): Promise<void> {
    this.#running++;
    const result = await slot.run<Task, Answer>(job.task);
    const usable = await slot.usable();
    this.#running--;
    this.#runningAlone = false;
    if (usable) this.#idle.push(slot);
    else this.#lose(slot);
    if ('answer' in result) job.settle({ outcome: 'answer', answer: result.answer });
    else if (this.#ended !== null) job.settle({ outcome: 'no-worker', reason: this.#ended });
    else if (job.failed !== null) {
      job.settle({ outcome: 'refused', reason: `${job.failed}; tried again alone: ${result.failed}` });
    } else {
      job.failed = result.failed;
      this.#alone.push(job);
    }
    this.#next();
  }

  #lose(slot: Slot): void {
    this.#all.delete(slot);
    if (this.#all.size > 0 || this.#ended !== null) return;
    const reason = `all ${this.#settings.threads} worker threads hang and could not be ended; restart the service`;
    this.#end(reason);
    this.#settings.onAllLost?.(reason);
  }

  #end(reason: string): void {
    this.#ended ??= reason;
    this.#next();
  }
}

/** One worker thread and, when it ended, its successor. */
class Slot {
  readonly #settings: PoolSettings;
  readonly #pool: Piscina;
  /** The thread has not answered yet since it was made, or may have been made anew. */
  #fresh = true;
  /** Resolves to whether the worker that was told to end did. */
  #ending: Promise<boolean> | null = null;

  constructor(settings: PoolSettings) {
    this.#settings = settings;
    this.#pool = new Piscina({
      filename: settings.worker.href,
      minThreads: 1,
      maxThreads: 1,
      resourceLimits: settings.resourceLimits ?? usualLimits,
    });
    // A worker that breaks while it has no task is replaced; its next task tells.
    this.#pool.on('error', () => {});
  }

  async run<Task, Answer>(task: Task): Promise<Try<Answer>> {
    const abort = new AbortController();
    const { deadlineMs, startMs = usualStartMs } = this.#settings;
    const longestMs = deadlineMs + (this.#fresh ? startMs : 0);
    const deadline = setTimeout(() => {
      const threads = [...this.#pool.threads];
      this.#ending = this.#ended(threads);
      abort.abort();
      // A thread that is still loading has not taken the task, so the abort alone would not end it.
      for (const thread of threads) void thread.terminate();
    }, longestMs);
    try {
      const answer = (await this.#pool.run(task, { signal: abort.signal })) as Answer;
      this.#fresh = false;
      return { answer };
    } catch (error) {
      this.#fresh = true;
      const reason = error instanceof Error ? error.message : String(error);
      return { failed: abort.signal.aborted ? `it did not end within ${deadlineMs / 1000} s` : reason };
    } finally {
      clearTimeout(deadline);
    }
  }

  /** False once the worker was told to end and did not. */
  async usable(): Promise<boolean> {
    if (this.#ending === null) return true;
    const ended = await this.#ending;
    this.#ending = null;
    // The successor that was made already is not used: the lost one still holds its share of the machine.
    if (!ended) void this.#pool.destroy().catch(() => {});
    return ended;
  }

  async close(): Promise<void> {
    await this.#pool.destroy();
  }

  /** Whether all of these end in time. A thread that has ended already shows -1 as its number. */
  #ended(workers: readonly Worker[]): Promise<boolean> {
    const { lostAfterMs = usualLostAfterMs } = this.#settings;
    const alive = workers.filter((worker) => worker.threadId !== -1);
    if (alive.length === 0) return Promise.resolve(true);
    return new Promise((resolve) => {
      const lost = setTimeout(() => resolve(false), lostAfterMs);
      let left = alive.length;
      const gone = () => {
        if (--left > 0) return;
        clearTimeout(lost);
        resolve(true);
      };
      for (const worker of alive) worker.once('exit', gone);
    });
  }
}
