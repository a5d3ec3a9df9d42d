import { chmodSync } from 'node:fs';
import Database from 'better-sqlite3';
import { sql } from 'kysely';
import { expect, test } from 'vitest';
import { LedgerError } from '../../src/store/ledger-error.ts';
import type { Writer } from '../../src/store/lent-connection.ts';
import { ledgerPath } from '../../src/store/open-ledger.ts';
import { busyDelaysMs } from '../../src/store/transaction.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

async function put(writer: Writer, key: string, wallMs: number): Promise<void> {
  await writer.insertInto('told_once').values({ key, wall_ms: wallMs }).execute();
}

async function keys(ledger: Awaited<ReturnType<typeof opened>>): Promise<string[]> {
  const rows = await ledger.read((reader) =>
    reader.selectFrom('told_once').select('key').orderBy('key').execute(),
  );
  return rows.map((row) => row.key);
}

test('a commit is on the disk before transact answers, also after a write-ahead ledger was opened again', async () => {
  const folder = temporaryFolder();
  for (const mode of ['owner', 'owner', 'guest'] as const) {
    const ledger = await opened(folder, { mode });
    const settings = await ledger.transact(async (writer) => ({
      synchronous: (await sql<{ synchronous: number }>`pragma synchronous`.execute(writer)).rows[0]
        ?.synchronous,
      journal: (await sql<{ journal_mode: string }>`pragma journal_mode`.execute(writer)).rows[0]
        ?.journal_mode,
      foreign: (await sql<{ foreign_keys: number }>`pragma foreign_keys`.execute(writer)).rows[0]
        ?.foreign_keys,
      timeout: (await sql<{ timeout: number }>`pragma busy_timeout`.execute(writer)).rows[0]?.timeout,
      vacuum: (await sql<{ auto_vacuum: number }>`pragma auto_vacuum`.execute(writer)).rows[0]?.auto_vacuum,
    }));
    expect(settings).toEqual({ synchronous: 2, journal: 'wal', foreign: 1, timeout: 50, vacuum: 2 });
    await ledger.close();
  }
});

test('what is thrown inside a transaction leaves nothing of it behind', async () => {
  const ledger = await opened(temporaryFolder());
  const failing = ledger.transact(async (writer) => {
    await put(writer, 'a', 1);
    throw new Error('no');
  });
  await expect(failing).rejects.toThrow('no');
  expect(await keys(ledger)).toEqual([]);
  await ledger.transact((writer) => put(writer, 'b', 1));
  expect(await keys(ledger)).toEqual(['b']);
});

test('transactions run one after another in the order asked, hooks after the commit and only then', async () => {
  const ledger = await opened(temporaryFolder());
  const order: string[] = [];
  const other = new Database(ledgerPath(ledger.folder), { readonly: true });
  const add = (name: string) =>
    ledger.transact(async (writer, afterCommit) => {
      afterCommit(() =>
        order.push(`${name} sees ${other.prepare('select count(*) from told_once').pluck().get()}`),
      );
      order.push(`${name} begins`);
      await put(writer, name, 1);
    });
  await Promise.all([add('a'), add('b')]);
  await expect(
    ledger.transact(async (_, afterCommit) => {
      afterCommit(() => order.push('never'));
      throw new Error('no');
    }),
  ).rejects.toThrow('no');
  other.close();
  expect(order).toEqual(['a begins', 'a sees 1', 'b begins', 'b sees 2']);
});

test('a transaction takes the right to write at its beginning, so what it has read cannot be overtaken', async () => {
  const ledger = await opened(temporaryFolder());
  const other = new Database(ledgerPath(ledger.folder), { timeout: 0 });
  await ledger.transact(async (writer) => {
    await writer.selectFrom('told_once').selectAll().orderBy('key').execute();
    expect(() => other.exec(`insert into told_once values ('other', 1)`)).toThrow('locked');
    await put(writer, 'mine', 1);
  });
  other.close();
  expect(await keys(ledger)).toEqual(['mine']);
});

test('a ledger held by another process is tried again without freezing the service', async () => {
  const ledger = await opened(temporaryFolder(), { wait: letGo });
  const other = new Database(ledgerPath(ledger.folder));
  other.exec('begin immediate');
  const waits: number[] = [];
  let runs = 0;
  async function letGo(ms: number): Promise<void> {
    waits.push(ms);
    // A turn of the event loop passes: the service lives on between two tries.
    await new Promise((resolve) => setImmediate(resolve));
    if (waits.length === 3) other.exec('commit');
  }
  await ledger.transact(async (writer) => {
    runs++;
    await put(writer, 'a', 1);
  });
  other.close();
  expect(waits).toEqual(busyDelaysMs.slice(0, 3));
  expect(runs).toBe(1);
  expect(await keys(ledger)).toEqual(['a']);
});

test('a ledger held for good is given up as busy after a bounded number of tries, and works again later', async () => {
  let waits = 0;
  const ledger = await opened(temporaryFolder(), {
    wait: async () => {
      waits++;
    },
  });
  const other = new Database(ledgerPath(ledger.folder));
  other.exec('begin immediate');
  const error = await ledger.transact((writer) => put(writer, 'a', 1)).catch((thrown: unknown) => thrown);
  expect(error).toBeInstanceOf(LedgerError);
  expect(error).toMatchObject({ kind: 'busy' });
  expect(waits).toBe(busyDelaysMs.length);
  expect(await keys(ledger)).toEqual([]);
  other.close();
  await ledger.transact((writer) => put(writer, 'b', 1));
  expect(await keys(ledger)).toEqual(['b']);
});

test('a transaction that is run again begins anew: no rows and no hooks of the first run', async () => {
  let fail = true;
  const ledger = await opened(temporaryFolder(), {
    wait: async () => {},
    step: (name) => {
      if (name !== 'transaction: before commit' || !fail) return;
      fail = false;
      throw Object.assign(new Error('held'), { code: 'SQLITE_BUSY' });
    },
  });
  const told: string[] = [];
  let run = 0;
  await ledger.transact(async (writer, afterCommit) => {
    run++;
    const name = `run ${run}`;
    await put(writer, name, run);
    afterCommit(() => told.push(name));
  });
  expect(told).toEqual(['run 2']);
  expect(await keys(ledger)).toEqual(['run 2']);
});

test('a query that outlives its transaction is refused, awaited or not', async () => {
  const ledger = await opened(temporaryFolder());
  let kept: Writer | undefined;
  let floating: Promise<unknown> = Promise.resolve();
  await ledger.transact(async (writer) => {
    kept = writer;
    await put(writer, 'a', 1);
  });
  await expect(put(kept as Writer, 'b', 1)).rejects.toThrow('after its transaction had ended');
  await ledger
    .transact(async (writer) => {
      floating = put(writer, 'c', 1).then(() => put(writer, 'd', 1));
      floating.catch(() => {});
      throw new Error('no');
    })
    .catch(() => {});
  await expect(floating).rejects.toThrow('after its transaction had ended');
  expect(await keys(ledger)).toEqual(['a']);
});

test('a transaction that awaits anything but the ledger is rolled back and says so', async () => {
  const ledger = await opened(temporaryFolder());
  const slow = ledger.transact(async (writer) => {
    await put(writer, 'a', 1);
    await new Promise((resolve) => setImmediate(() => setImmediate(resolve)));
    await put(writer, 'b', 1);
  });
  await expect(slow).rejects.toThrow('awaited something other than the ledger');
  expect(await keys(ledger)).toEqual([]);
  await expect(ledger.transact(() => ledger.transact((writer) => put(writer, 'c', 1)))).rejects.toThrow(
    'awaited',
  );
});

test('reading sees one state throughout and cannot write', async () => {
  const ledger = await opened(temporaryFolder());
  await ledger.read(async (reader) => {
    const before = await reader.selectFrom('told_once').selectAll().execute();
    const other = new Database(ledgerPath(ledger.folder));
    other.exec(`insert into told_once values ('other', 1)`);
    other.close();
    expect(await reader.selectFrom('told_once').selectAll().execute()).toEqual(before);
    const write = put(reader as Writer, 'b', 1);
    await expect(write).rejects.toThrow('readonly');
  });
  expect(await keys(ledger)).toEqual(['other']);
  const reader = await opened(ledger.folder, { mode: 'reader' });
  expect(await keys(reader)).toEqual(['other']);
  expect(() => reader.transact((writer) => put(writer, 'c', 1))).toThrow('reading only');
});

test('values that are no numbers, and fractions of a millisecond, are never stored', async () => {
  const ledger = await opened(temporaryFolder());
  for (const value of [Number.NaN, Number.POSITIVE_INFINITY]) {
    await expect(ledger.transact((writer) => put(writer, 'a', value))).rejects.toThrow('never stores');
  }
  const forgotten = sql`insert into told_once (key, wall_ms) values (${undefined}, 1)`;
  await expect(ledger.transact((writer) => forgotten.execute(writer))).rejects.toThrow('never stores');
  await expect(ledger.transact((writer) => put(writer, 'a', 0.5))).rejects.toThrow(
    'cannot store REAL value in INTEGER',
  );
  expect(await keys(ledger)).toEqual([]);
});

test('a full disk comes out as such, loses what was not committed and nothing else', async () => {
  const folder = temporaryFolder();
  const roomy = await opened(folder);
  await roomy.transact((writer) => put(writer, 'before', 1));
  await roomy.close();
  const pages = new Database(ledgerPath(folder)).pragma('page_count', { simple: true }) as number;
  const ledger = await opened(folder, { largestPages: pages });
  const error = await ledger
    .transact(async (writer) => {
      for (let row = 0; row < 500; row++) await put(writer, `${row} ${'x'.repeat(1000)}`, row);
    })
    .catch((thrown: unknown) => thrown);
  expect(error).toBeInstanceOf(LedgerError);
  expect(error).toMatchObject({ kind: 'full', code: 'SQLITE_FULL' });
  expect(await keys(ledger)).toEqual(['before']);
  await ledger.transact((writer) => put(writer, 'small', 1));
  expect(await keys(ledger)).toEqual(['before', 'small']);
});

test('the write-ahead log is emptied by a checkpoint and its size can be seen', async () => {
  const ledger = await opened(temporaryFolder());
  await ledger.transact((writer) => put(writer, 'x'.repeat(100_000), 1));
  expect(ledger.walBytes()).toBeGreaterThan(100_000);
  expect(await ledger.checkpoint()).toEqual({ complete: true, walBytes: 0 });
  await ledger.transact((writer) => put(writer, 'y', 1));
  const reading = new Database(ledgerPath(ledger.folder), { readonly: true });
  reading.exec('begin; select * from told_once');
  await ledger.transact((writer) => put(writer, 'z', 1));
  expect((await ledger.checkpoint()).complete).toBe(false);
  reading.close();
  expect((await ledger.checkpoint()).complete).toBe(true);
});

test.skipIf(process.getuid?.() === 0)(
  'a folder without the right to write comes out as read-only',
  async () => {
    const folder = temporaryFolder();
    chmodSync(folder, 0o500);
    await expect(opened(folder)).rejects.toThrow('no right');
  },
);
