import { readdirSync, readFileSync, statSync, writeFileSync } from 'node:fs';
import { join } from 'node:path';
import Database from 'better-sqlite3';
import { expect, test } from 'vitest';
import { backupLedger, quickCheck } from '../../src/store/backup.ts';
import { ledgerPath } from '../../src/store/open-ledger.ts';
import { opened, temporaryFolder } from './temporary-ledger.ts';

test('a backup taken while the service writes is whole, consistent, and opens as a ledger', async () => {
  const folder = temporaryFolder();
  const ledger = await opened(folder);
  let written = 0;
  const writePair = () =>
    ledger.transact(async (writer) => {
      for (const half of ['a', 'b']) {
        await writer
          .insertInto('told_once')
          .values({ key: `${half}${written} ${'x'.repeat(2000)}`, wall_ms: written })
          .execute();
      }
      written++;
    });
  for (let row = 0; row < 200; row++) await writePair();
  const target = temporaryFolder();
  let ended = false;
  const backup = backupLedger(ledger.path, join(target, 'ledger.sqlite')).finally(() => {
    ended = true;
  });
  const before = written;
  while (!ended) {
    await writePair();
    await new Promise((resolve) => setImmediate(resolve));
  }
  expect(written).toBeGreaterThan(before);
  const done = await backup;
  expect(done).toMatchObject({
    file: join(target, 'ledger.sqlite'),
    bytes: statSync(join(target, 'ledger.sqlite')).size,
  });
  expect(readdirSync(target)).toEqual(['ledger.sqlite']);
  expect(await quickCheck(ledgerPath(target))).toEqual([]);
  const restored = await opened(target);
  expect(restored.id).toBe(ledger.id);
  const halves = await restored.read((reader) =>
    reader.selectFrom('told_once').select('wall_ms').orderBy('key').execute(),
  );
  // Each transaction wrote two rows: never one without the other.
  expect(halves.length % 2).toBe(0);
  expect(halves.length).toBeGreaterThanOrEqual(2 * before);
});

test('a backup never overwrites, and one that stops half-way leaves no file of that name', async () => {
  const ledger = await opened(temporaryFolder());
  const target = temporaryFolder();
  const file = join(target, 'copy.sqlite');
  writeFileSync(file, 'precious');
  const steps: string[] = [];
  expect(await backupLedger(ledger.path, file, (name) => steps.push(name))).toMatchObject({
    refused: 'exists',
  });
  expect(steps).toEqual([]);
  expect(readFileSync(file, 'utf8')).toBe('precious');
  for (const stop of ['backup: copied', 'backup: checked', 'backup: forced to the disk'] as const) {
    const other = join(target, 'other.sqlite');
    const stopped = backupLedger(ledger.path, other, (name) => {
      if (name === stop) throw new Error(`stopped at ${name}`);
    });
    await expect(stopped).rejects.toThrow(`stopped at ${stop}`);
    expect(readdirSync(target)).toEqual(['copy.sqlite']);
  }
  const refused = async (from: string, to: string) => {
    const answer = await backupLedger(from, to);
    if (!('refused' in answer)) throw new Error('a backup was made');
    return `${answer.refused}: ${answer.reason}`;
  };
  const nowhere = join(target, 'no', 'copy.sqlite');
  expect(await refused(ledger.path, nowhere)).toBe(
    `missing: the folder of ${nowhere} does not exist; make it first`,
  );
  const none = join(target, 'none.sqlite');
  expect(await refused(none, join(target, 'new.sqlite'))).toBe(`missing: there is no ledger ${none} to copy`);
  expect(await refused(ledger.path, '/proc/copy.sqlite')).toContain('/proc/copy.sqlite');
});

test('the quick check finds a damaged page', async () => {
  const folder = temporaryFolder();
  const ledger = await opened(folder);
  await ledger.transact(async (writer) => {
    for (let row = 0; row < 300; row++) {
      await writer
        .insertInto('told_once')
        .values({ key: `${row} ${'x'.repeat(500)}`, wall_ms: row })
        .execute();
    }
  });
  await ledger.close();
  expect(await quickCheck(ledgerPath(folder))).toEqual([]);
  const bytes = readFileSync(ledgerPath(folder));
  const connection = new Database(ledgerPath(folder), { readonly: true });
  const root = connection
    .prepare(`select rootpage from sqlite_master where name = 'told_once'`)
    .pluck()
    .get() as number;
  connection.close();
  bytes.fill(0x5a, (root - 1) * 4096, root * 4096);
  writeFileSync(ledgerPath(folder), bytes);
  const findings = await quickCheck(ledgerPath(folder));
  expect(Array.isArray(findings) && findings.length > 0).toBe(true);
});
