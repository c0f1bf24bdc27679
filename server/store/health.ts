import type { Connection } from './database';

/** Where PostgreSQL keeps its data, on its own machine; null where it does not tell this role (`pg_read_all_settings`). */
export async function dataDirectory(connection: Connection): Promise<string | null> {
  const { rows } = await connection.pool.query<{ setting: string }>("select setting from pg_settings where name = 'data_directory'");
  return rows[0]?.setting || null;
}

/** Whether the database answers a question. */
export async function ping(connection: Connection): Promise<boolean> {
  try {
    await connection.pool.query('select 1');
    return true;
  } catch {
    return false;
  }
}
