import { join } from 'node:path';
import { drizzle } from 'drizzle-orm/node-postgres';
import { migrate } from 'drizzle-orm/node-postgres/migrator';
import type { Connection } from './connect';

const lockNumber = 7_401_967;

/**
 * Brings the database to the newest schema; does nothing where it is there already. Two servers that start together wait for each other. All of it goes over
 * the connection that holds the lock and has no time limit.
 */
export async function migrateToLatest(connection: Connection): Promise<void> {
  const client = await connection.pool.connect();
  try {
    await client.query('set statement_timeout = 0');
    await client.query('select pg_advisory_lock($1)', [lockNumber]);
    await migrate(drizzle(client), { migrationsFolder: join(__dirname, 'migrations') });
  } finally {
    await client.query('select pg_advisory_unlock($1)', [lockNumber]).catch(() => undefined);
    client.release(true);
  }
}
