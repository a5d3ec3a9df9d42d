import { spawn } from 'node:child_process';
import { once } from 'node:events';
import { existsSync, readdirSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { expect, test } from 'vitest';
import { openingSteps } from '../../src/store/ledger-steps.ts';
import { type Migration, migrations } from '../../src/store/migrations/index.ts';
import { networkFileSystems } from '../../src/store/network-share.ts';
import { ledgerPath } from '../../src/store/open-ledger.ts';
import { isOwned } from '../../src/store/owner-lock.ts';
import { opened, refusal, temporaryFolder } from './temporary-ledger.ts';

/** The newest version that the program knows; one more is made up here. */
const newest = migrations.length;

const second: Migration = {
  number: newest + 1,
  name: 'second',
  statements: [
    'alter table sources add column colour text',
    'create table extra (id integer primary key) strict',
  ],
};

function tablesOf(folder: string): string[] {
  const connection = new Database(ledgerPath(folder), { readonly: true });
  const names = connection
    .prepare(`select name from sqlite_master where type = 'table' order by name`)
    .pluck()
    .all();
  connection.close();
  return names as string[];
}

test('a ledger is made once, keeps its name for ever, and its level table is kept in key order', async () => {
  const folder = temporaryFolder();
  const made = await opened(folder);
  expect(made.version).toBe(migrations.length);
  await made.close();
  const again = await opened(folder);
  expect(again.id).toBe(made.id);
  expect(made.id).toMatch(/^[0-9a-f-]{36}$/);
  const connection = new Database(ledgerPath(folder), { readonly: true });
  const levels = connection
    .prepare(`select sql from sqlite_master where name = 'levels'`)
    .pluck()
    .get() as string;
  connection.close();
  expect(levels).toMatch(/primary key \(point_id, used_ms, band_id, series_id\)\) strict, without rowid/);
  expect(readdirSync(folder).filter((name) => name.startsWith('ledger-before'))).toEqual([]);
});

test('a migration that stops half-way leaves the ledger as it was and runs again from its beginning', async () => {
  const folder = temporaryFolder();
  const broken: Migration = { ...second, statements: [...second.statements, 'create table nonsense ('] };
  await expect(opened(folder, { migrations: [...migrations, broken] })).rejects.toThrow('incomplete input');
  const half = tablesOf(folder);
  expect(half).toContain('levels');
  expect(half).not.toContain('extra');
  const killed = opened(folder, {
    migrations: [...migrations, second],
    step: (name) => {
      if (name === 'migration: noted as done') throw new Error('killed here');
    },
  });
  await expect(killed).rejects.toThrow('killed here');
  expect(tablesOf(folder)).toEqual(half);
  const done = await opened(folder, { migrations: [...migrations, second] });
  expect(done.version).toBe(newest + 1);
  expect(tablesOf(folder)).toContain('extra');
});

test('an older ledger is copied before it is changed; the copy is whole', async () => {
  const folder = temporaryFolder();
  const old = await opened(folder);
  await old.transact(async (writer) => {
    await writer.insertInto('told_once').values({ key: 'kept', wall_ms: 1 }).execute();
  });
  await old.close();
  writeFileSync(join(folder, `ledger-before-${newest + 1}.sqlite.part`), 'left by an earlier try');
  await opened(folder, { migrations: [...migrations, second] });
  const copy = new Database(join(folder, `ledger-before-${newest + 1}.sqlite`), { readonly: true });
  expect(copy.pragma('quick_check', { simple: true })).toBe('ok');
  expect(copy.prepare('select key from told_once').pluck().all()).toEqual(['kept']);
  expect(copy.prepare('select max(number) from migrations').pluck().get()).toBe(newest);
  copy.close();
  expect(existsSync(join(folder, `ledger-before-${newest + 1}.sqlite.part`))).toBe(false);
});

test('an error at any step of bringing a ledger up to date leaves it old or new, and the next start whole', async () => {
  for (const step of openingSteps) {
    const folder = temporaryFolder();
    const old = await opened(folder);
    await old.transact(async (writer) => {
      await writer.insertInto('told_once').values({ key: 'kept', wall_ms: 1 }).execute();
    });
    await old.close();
    const broken = opened(folder, {
      migrations: [...migrations, second],
      step: (name) => {
        if (name === step) throw new Error(`broken at ${name}`);
      },
    });
    await expect(broken).rejects.toThrow(`broken at ${step}`);
    expect(isOwned(folder), step).toBe(false);
    expect(readdirSync(folder).filter((name) => name.includes('.part'))).toEqual([]);
    const ledger = await opened(folder, { migrations: [...migrations, second] });
    expect(tablesOf(folder), step).toContain('extra');
    expect(await ledger.read((reader) => reader.selectFrom('told_once').select('key').execute())).toEqual([
      { key: 'kept' },
    ]);
    const copy = new Database(join(folder, `ledger-before-${newest + 1}.sqlite`), { readonly: true });
    expect(copy.prepare('select max(number) from migrations').pluck().get(), step).toBe(newest);
    copy.close();
  }
});

test('a newer ledger is refused by all, an older one by guests and readers, and neither is touched', async () => {
  const folder = temporaryFolder();
  await (await opened(folder, { migrations: [...migrations, second] })).close();
  for (const mode of ['owner', 'guest', 'reader'] as const) {
    const answer = await refusal(folder, { mode });
    expect(answer.refused).toBe('newer');
    expect(answer.reason).toContain(
      `is of version ${newest + 1}, this program knows versions up to ${newest}`,
    );
  }
  const third: Migration = {
    number: newest + 2,
    name: 'third',
    statements: ['create table third (id integer primary key)'],
  };
  for (const mode of ['guest', 'reader'] as const) {
    const answer = await refusal(folder, { mode, migrations: [...migrations, second, third] });
    expect(answer.refused).toBe('older');
    expect(answer.reason).toContain('start the service once');
  }
  expect(tablesOf(folder)).not.toContain('third');
});

test('guests and readers do not make a ledger; a file that is none is refused by what it is', async () => {
  const folder = temporaryFolder();
  for (const mode of ['guest', 'reader'] as const)
    expect((await refusal(folder, { mode })).refused).toBe('missing');
  expect(readdirSync(folder)).toEqual([]);
  writeFileSync(ledgerPath(folder), 'not a database at all, only words that go on and on'.repeat(100));
  expect((await refusal(folder)).refused).toBe('damaged');
  const elsewhere = temporaryFolder();
  new Database(ledgerPath(elsewhere)).exec('create table theirs (id integer)').close();
  const foreign = await refusal(elsewhere);
  expect(foreign.refused).toBe('foreign');
  expect(tablesOf(elsewhere)).toEqual(['theirs']);
});

test('a ledger on a network share is refused by its kind, a local disk is not', async () => {
  for (const [type, name] of networkFileSystems) {
    const answer = await refusal(temporaryFolder(), { fileSystemType: () => type });
    expect(answer.refused).toBe('network-share');
    expect(answer.reason).toContain(`(${name})`);
  }
  for (const local of [0xef53, 0x01021994, 0x9123683e, 0x65735546]) {
    await (await opened(temporaryFolder(), { fileSystemType: () => local })).close();
  }
});

test('one owner: a second is refused with the folder named, and a killed one leaves nothing in the way', async () => {
  const folder = temporaryFolder();
  expect(isOwned(folder)).toBe(false);
  const child = spawn(process.execPath, [join(import.meta.dirname, 'own-ledger.ts'), folder], {
    stdio: ['pipe', 'pipe', 'inherit'],
  });
  const [said] = (await once(child.stdout, 'data')) as [Buffer];
  expect(said.toString()).toBe('owns\n');
  expect(isOwned(folder)).toBe(true);
  const answer = await refusal(folder);
  expect(answer.refused).toBe('owned');
  expect(answer.reason).toContain(folder);
  const guest = await opened(folder, { mode: 'guest' });
  const seen = await guest.transact((writer) => writer.selectFrom('told_once').select('key').execute());
  expect(seen).toEqual([{ key: 'child' }]);
  const ended = once(child, 'exit');
  child.kill('SIGKILL');
  await ended;
  expect(isOwned(folder)).toBe(false);
  const owner = await opened(folder);
  expect(isOwned(folder)).toBe(true);
  expect((await refusal(folder)).refused).toBe('owned');
  await owner.close();
  expect(isOwned(folder)).toBe(false);
});
