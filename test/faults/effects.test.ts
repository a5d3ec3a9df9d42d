/**
 * The n-th effect fails, for every n, until a whole run passes untouched: each fails once with the error that a disk or a
 * mail server gives, the service goes on by itself, and in the end everything is as if nothing had failed.
 */
import { afterAll, describe, expect, it, vi } from 'vitest';
import { effects, systemError } from './failing-effects.ts';
import { playStory } from './story.ts';
import { removeTemplate, storyRun } from './story-run.ts';
import type { StoryState } from './story-state.ts';

vi.mock('better-sqlite3', async (original) => {
  const { default: Database } = await original<{ default: typeof import('better-sqlite3') }>();
  class Failing extends Database {
    #writes = false;
    override exec(sql: string) {
      if (sql.startsWith('begin')) this.#writes = sql === 'begin immediate';
      if (sql === 'commit' && this.#writes && effects.fails('ledger: commit'))
        throw Object.assign(new Error('database or disk is full'), { code: 'SQLITE_FULL' });
      return super.exec(sql);
    }
  }
  return { default: Failing };
});

vi.mock('node:fs/promises', async (original) => {
  const real = await original<typeof import('node:fs/promises')>();
  const failing =
    <A extends readonly unknown[], R>(name: string, code: string, work: (...args: A) => Promise<R>) =>
    async (...args: A): Promise<R> => {
      if (effects.fails(`files: ${name}`)) throw systemError(code, name, String(args[0]));
      return work(...args);
    };
  return {
    ...real,
    rename: failing('rename', 'EIO', real.rename),
    unlink: failing('unlink', 'EACCES', real.unlink),
    mkdir: failing('mkdir', 'ENOSPC', real.mkdir as (...args: unknown[]) => Promise<unknown>),
    writeFile: failing('writeFile', 'ENOSPC', real.writeFile as (...args: unknown[]) => Promise<void>),
    open: failing('open', 'EMFILE', real.open as (...args: unknown[]) => Promise<unknown>),
  };
});

vi.mock('../../src/advisory/mailer.ts', async (original) => {
  const real = await original<typeof import('../../src/advisory/mailer.ts')>();
  const createMailer: typeof real.createMailer = (...args) => {
    const mailer = real.createMailer(...args);
    return {
      ...mailer,
      send: async (sending) =>
        effects.fails('mail: send')
          ? { kind: 'later', answer: 'Connection timeout', server: 'out' }
          : mailer.send(sending),
    };
  };
  return { ...real, createMailer };
});

afterAll(removeTemplate);

const noStep = () => {};

type Row = Readonly<Record<string, unknown>>;

/**
 * What must come out the same when something is done some seconds later than it would have been: sources do not wait for
 * one another, so numbers and row ids may be dealt out in another order, and troubles are dated by when they were looked at.
 */
function meaningOf({ ledger, files, mails }: StoryState): unknown {
  const rows = (table: string) => ledger[table] as readonly Row[];
  const sorted = (table: string, of: (row: Row) => unknown) =>
    rows(table)
      .map((row) => JSON.stringify(of(row)))
      .sort();
  const isTrouble = (row: Row) => String(row.key).startsWith('trouble:');
  const journal = new Map<unknown, unknown[]>();
  for (const row of rows('journal')) {
    const { key, event, before, after, used_ms, file_name, reason } = row;
    const one = { event, before, after, file_name, reason, at: isTrouble(row) ? 'then' : used_ms };
    journal.set(key, [...(journal.get(key) ?? []), one]);
  }
  const exact = [
    'recordings',
    'attempts',
    'sources',
    'arrivals',
    'measurements',
    'peaks',
    'spectra',
    'machines',
    'summaries',
  ];
  return {
    files,
    mails: mails.length,
    exact: exact.map((table) => rows(table)),
    journal: [...journal].sort(),
    levels: sorted('levels', ({ series_id: _, ...row }) => row),
    states: sorted('states', ({ number: _, state, ...row }) => (isTrouble(row) ? row : { ...row, state })),
    lives: sorted('lives', ({ number: _, raised_used_ms, ...row }) =>
      isTrouble(row) ? row : { ...row, raised_used_ms },
    ),
    told: sorted('told', ({ number: _, identity: __, ...row }) => row),
    messages: sorted('messages', ({ kind, subject, priority }) => [
      kind,
      String(subject).replace(/ \d+:/, ''),
      priority,
    ]),
    deliveries: sorted('deliveries', ({ recipient, state }) => [recipient, state]),
  };
}

/** Plays the story with one effect failing; a service that ends over it is started again, at most once. */
async function playFailing(failing: number | null) {
  const run = await storyRun(null);
  effects.begin(failing);
  let endedBy: string | null = null;
  try {
    await playStory(run.folder, noStep);
  } catch (error) {
    endedBy = (error as Error).message;
    await playStory(run.folder, noStep);
  } finally {
    effects.end();
  }
  const received = run.received();
  return {
    state: meaningOf(run.state()),
    endedBy,
    failed: effects.failed,
    done: [...effects.done],
    twice: received.length - new Set(received).size,
  };
}

/** In `npm test` the first of each kind and a few between; in the long run every one. */
const everyOne = process.env.HUMLEDGER_LONG === '1';
const usualRuns = 4;

describe('an effect that fails once', () => {
  it(`${everyOne ? 'each' : 'some'} of a story's, and it ends as if nothing had failed`, async () => {
    const whole = await playFailing(null);
    expect(whole).toMatchObject({ endedBy: null, failed: null, twice: 0 });
    const kinds = new Set(whole.done);
    for (const kind of ['ledger: commit', 'files: rename', 'files: mkdir', 'files: open', 'mail: send'])
      expect(kinds).toContain(kind);
    const step = Math.ceil(whole.done.length / usualRuns);
    const picked = (n: number, name: string) =>
      everyOne || whole.done.indexOf(name) === n || n % step === Math.floor(step / 2);
    const numbers = whole.done.flatMap((name, n) => (picked(n, name) ? [n] : []));
    let ended = 0;
    for (const n of numbers) {
      const played = await playFailing(n);
      const what = `effect ${n} of ${whole.done.length}, ${played.failed}`;
      expect(played.state, what).toEqual(whole.state);
      expect(played.twice, what).toBe(0);
      if (played.endedBy !== null) {
        // Only what happens before the service is there ends it: it refuses to start, in words.
        expect(played.endedBy, what).toMatch(/the disk is full/);
        ended++;
      }
    }
    // Beyond the last one nothing fails, which shows that all were met.
    expect((await playFailing(whole.done.length)).failed).toBe(null);
    expect(ended).toBeLessThan(numbers.length / 4);
  }, 3_600_000);
});
