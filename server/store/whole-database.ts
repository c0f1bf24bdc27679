import { sql } from 'drizzle-orm';
import type { Handle } from './database';

/** What backup and restore have to know of the database as a whole. */

/** Every table with its number of rows, partitions as the one table they are. */
export async function tablesOf(db: Handle): Promise<[table: string, rows: number][]> {
  const found = await db.execute<{ name: string }>(
    sql`select c.relname as name from pg_class c join pg_namespace n on n.oid = c.relnamespace
        where n.nspname = 'public' and c.relkind in ('r', 'p') and not c.relispartition order by c.relname`,
  );
  const counts: [string, number][] = [];
  for (const { name } of found.rows) {
    const count = await db.execute<{ count: number }>(sql`select count(*)::double precision as count from ${sql.identifier(name)}`);
    counts.push([name, count.rows[0]?.count ?? 0]);
  }
  return counts;
}

/** Sessions on this database besides the one that asks. */
export async function otherConnections(db: Handle): Promise<number> {
  const found = await db.execute<{ count: number }>(
    sql`select count(*)::int as count from pg_stat_activity
        where datname = current_database() and pid <> pg_backend_pid() and backend_type = 'client backend'`,
  );
  return found.rows[0]?.count ?? 0;
}

/** Throws away everything: tables, functions, the list of migrations. */
export async function wipe(db: Handle): Promise<void> {
  await db.execute(sql`drop schema if exists public cascade`);
  await db.execute(sql`drop schema if exists drizzle cascade`);
  await db.execute(sql`create schema public`);
}
