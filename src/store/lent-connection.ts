import type { Database, Statement } from 'better-sqlite3';
import {
  type CompiledQuery,
  type DatabaseConnection,
  type Driver,
  Kysely,
  type QueryResult,
  SqliteAdapter,
  SqliteIntrospector,
  SqliteQueryCompiler,
} from 'kysely';
import type { LedgerTables } from './schema.ts';

/** What a reading function gets: queries, no writing. */
export type Reader = Pick<Kysely<LedgerTables>, 'selectFrom' | 'with' | 'fn' | 'getExecutor'>;

/** What a transaction lends: all of Reader, and writing. */
export type Writer = Reader & Pick<Kysely<LedgerTables>, 'insertInto' | 'updateTable' | 'deleteFrom'>;

/** Distinct texts are bounded by the queries of this folder times the sizes of their row lists. */
const statementsKept = 300;

/** One connection with its prepared statements, oldest out first: preparing costs more than most queries. */
export class PreparedConnection {
  readonly connection: Database;
  readonly #statements = new Map<string, Statement>();

  constructor(connection: Database) {
    this.connection = connection;
  }

  run(query: CompiledQuery): QueryResult<never> {
    assertStorable(query);
    const statement = this.#prepare(query.sql);
    if (statement.reader) return { rows: statement.all(query.parameters) as never[] };
    const { changes } = statement.run(query.parameters);
    return { numAffectedRows: BigInt(changes), rows: [] };
  }

  #prepare(sql: string): Statement {
    const kept = this.#statements.get(sql);
    if (kept !== undefined) {
      this.#statements.delete(sql);
      this.#statements.set(sql, kept);
      return kept;
    }
    const statement = this.connection.prepare(sql);
    this.#statements.set(sql, statement);
    if (this.#statements.size > statementsKept) {
      for (const oldest of this.#statements.keys()) {
        this.#statements.delete(oldest);
        break;
      }
    }
    return statement;
  }
}

/** SQLite would silently store NaN as null and take Infinity; neither is a level, so neither gets here. */
function assertStorable(query: CompiledQuery): void {
  query.parameters.forEach((value, index) => {
    if (value === undefined || (typeof value === 'number' && !Number.isFinite(value))) {
      throw new Error(
        `value ${index + 1} of a query is ${value}, which the ledger never stores: ${query.sql.slice(0, 200)}`,
      );
    }
  });
}

/**
 * A query builder over a connection for as long as a transaction lasts. After `end` every query is refused, also one
 * that was begun before and not awaited. Queries answer without leaving the turn of the event loop.
 */
export function lend(prepared: PreparedConnection): { readonly db: Kysely<LedgerTables>; end(): void } {
  let ended = false;
  const connection: DatabaseConnection = {
    executeQuery: async <R>(query: CompiledQuery): Promise<QueryResult<R>> => {
      if (ended) throw new Error(`a query came after its transaction had ended: ${query.sql.slice(0, 200)}`);
      return prepared.run(query);
    },
    // biome-ignore lint/correctness/useYield: streams are refused, a cursor would be held across an await
    streamQuery: async function* () {
      throw new Error('the ledger gives no streams; ask for a bounded page');
    },
  };
  const db = new Kysely<LedgerTables>({
    dialect: {
      createDriver: () => driverOf(connection),
      createAdapter: () => new SqliteAdapter(),
      createQueryCompiler: () => new SqliteQueryCompiler(),
      createIntrospector: (instance) => new SqliteIntrospector(instance),
    },
  });
  return {
    db,
    end: () => {
      ended = true;
    },
  };
}

function driverOf(connection: DatabaseConnection): Driver {
  const refuse = async (): Promise<never> => {
    throw new Error('a transaction inside a transaction; pass the one that is open on');
  };
  return {
    init: async () => {},
    acquireConnection: async () => connection,
    beginTransaction: refuse,
    commitTransaction: refuse,
    rollbackTransaction: refuse,
    releaseConnection: async () => {},
    destroy: async () => {},
  };
}
