import { CompiledQuery } from 'kysely';
import type { Writer } from './lent-connection.ts';
import type { LedgerTables } from './schema.ts';

/** The widest table written so has 11 columns: far below SQLite's 32,766 variables a query. */
const rowsAtOnce = 64;

/**
 * Inserts the rows that come by the dozen with each recording. Building a query of some hundred values costs a query
 * builder far more than SQLite needs to store them, so the text is put together here, and is the same for each number of
 * rows. Columns and rows are checked against the table's type; `onConflict` is the tail of the statement.
 */
export async function insertRows<
  Table extends keyof LedgerTables,
  Column extends keyof LedgerTables[Table] & string,
>(
  writer: Writer,
  table: Table,
  columns: readonly Column[],
  rows: readonly Record<Column, unknown>[],
  onConflict = '',
): Promise<void> {
  const names = columns.map((column) => `"${column}"`).join(', ');
  const marks = `(${columns.map(() => '?').join(', ')})`;
  for (let from = 0; from < rows.length; from += rowsAtOnce) {
    const chunk = rows.slice(from, from + rowsAtOnce);
    const values: unknown[] = [];
    for (const row of chunk) for (const column of columns) values.push(row[column]);
    const text = `insert into "${table}" (${names}) values ${chunk.map(() => marks).join(', ')} ${onConflict}`;
    await writer.getExecutor().executeQuery(CompiledQuery.raw(text, values));
  }
}
