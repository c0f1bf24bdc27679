import type { NodePgDatabase } from 'drizzle-orm/node-postgres';
import type { Connection, Handle, Schema } from '@/db/connect';

export type { Connection, Handle };
export type Database = NodePgDatabase<Schema>;
/** For what only makes sense inside a transaction. */
export type Transaction = Parameters<Parameters<Database['transaction']>[0]>[0];

interface DatabaseError {
  code: string;
  constraint?: string;
}

/** PostgreSQL's own error inside what the mapper threw, or null. */
function databaseErrorOf(error: unknown): DatabaseError | null {
  if (typeof error !== 'object' || error === null) return null;
  if ('code' in error && typeof error.code === 'string' && /^[0-9A-Z]{5}$/.test(error.code)) return error as DatabaseError;
  return 'cause' in error ? databaseErrorOf(error.cause) : null;
}

/** Whether a write failed because a row like it is there already; `constraint` names the unique index that is meant. */
export function isAlreadyThere(error: unknown, constraint?: string): boolean {
  const found = databaseErrorOf(error);
  return found?.code === '23505' && (constraint === undefined || found.constraint === constraint);
}

/** The one row of an answer that must hold it. */
export function one<T>(rows: readonly T[]): T {
  const [row] = rows;
  if (row === undefined) throw new Error('the database answered with no row where one must be');
  return row;
}
