import type { Database } from 'better-sqlite3';
import type { LedgerStep } from '../ledger-steps.ts';
import { first } from './001-first.ts';
import { baselines } from './002-baselines.ts';
import { pooling } from './003-pooling.ts';
import { evidence } from './004-evidence.ts';
import { envelope } from './005-envelope.ts';
import { suppressions } from './006-suppressions.ts';
import { messages } from './007-messages.ts';

/** One step of the ledger's tables; `number` counts from 1 without gaps, in the order of `migrations`. */
export interface Migration {
  readonly number: number;
  readonly name: string;
  readonly statements: readonly string[];
}

/** In this order; who adds one takes the next number. */
export const migrations: readonly Migration[] = [
  first,
  baselines,
  pooling,
  evidence,
  envelope,
  suppressions,
  messages,
];

interface Now {
  readonly wallMs: number;
  readonly step: (name: LedgerStep) => void;
}

interface Now {
  readonly wallMs: number;
  readonly step: (name: LedgerStep) => void;
}

/** Version of a ledger: the greatest number done; 0 for an empty file; null where the file is another program's. */
export function ledgerVersion(connection: Database): number | null {
  const tables = connection
    .prepare(`select name from sqlite_master where type = 'table' order by name`)
    .pluck()
    .all() as string[];
  if (tables.length === 0) return 0;
  if (!tables.includes('migrations')) return null;
  const newest = connection.prepare('select max(number) from migrations').pluck().get() as number | null;
  return newest ?? 0;
}

/**
 * Runs what is not done yet. Each migration commits together with the row that says it is done, so one that was
 * killed half-way leaves nothing behind and runs again from its beginning.
 */
export function migrate(connection: Database, known: readonly Migration[], now: Now): void {
  const done = ledgerVersion(connection) ?? 0;
  for (const [index, migration] of known.entries()) {
    if (migration.number !== index + 1) throw new Error(`migration ${migration.name} is out of order`);
    if (migration.number <= done) continue;
    runOne(connection, migration, now);
  }
}

function runOne(connection: Database, migration: Migration, now: Now): void {
  connection.exec('begin immediate');
  try {
    connection.exec(
      'create table if not exists migrations (number integer primary key, name text not null, done_ms integer not null) strict',
    );
    now.step('migration: begun');
    for (const statement of migration.statements) connection.exec(statement);
    now.step('migration: tables changed');
    connection
      .prepare('insert into migrations (number, name, done_ms) values (?, ?, ?)')
      .run(migration.number, migration.name, now.wallMs);
    now.step('migration: noted as done');
    connection.exec('commit');
    now.step('migration: committed');
  } catch (error) {
    if (connection.inTransaction) connection.exec('rollback');
    throw error;
  }
}
