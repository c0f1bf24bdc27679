import type { NodePgDatabase } from 'drizzle-orm/node-postgres';
import type { Connection, Handle, Schema } from '@/db/connect';

export type { Connection, Handle };
export type Database = NodePgDatabase<Schema>;
/** For what only makes sense inside a transaction. */
export type Transaction = Parameters<Parameters<Database['transaction']>[0]>[0];

/** The one row of an answer that must hold it. */
export function one<T>(rows: readonly T[]): T {
  const [row] = rows;
  if (row === undefined) throw new Error('the database answered with no row where one must be');
  return row;
}
