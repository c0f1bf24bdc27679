import type { Connection } from './database';

/** Whether the database answers a question. */
export async function ping(connection: Connection): Promise<boolean> {
  try {
    await connection.pool.query('select 1');
    return true;
  } catch {
    return false;
  }
}
