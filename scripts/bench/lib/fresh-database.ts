import { randomBytes } from 'node:crypto';
import { Client } from 'pg';
import { connect, type Connection } from '@/db/connect';
import { migrateToLatest } from '@/db/migrate';

export interface BenchDatabase {
  url: string;
  connection: Connection;
}

async function asAdmin(text: string): Promise<string> {
  const admin = process.env.EVENFALL_DATABASE_ADMIN_URL;
  if (admin === undefined || admin === '') throw new Error('this benchmark needs a database: start it through npm run bench');
  const client = new Client({ connectionString: admin });
  await client.connect();
  try {
    await client.query(text);
  } finally {
    await client.end();
  }
  return admin;
}

/** Gives `work` an empty migrated database of its own, which is dropped afterwards whatever happens. */
export async function withDatabase<T>(work: (database: BenchDatabase) => Promise<T>): Promise<T> {
  const name = `evenfall_bench_${randomBytes(8).toString('hex')}`;
  const address = new URL(await asAdmin(`create database "${name}"`));
  address.pathname = `/${name}`;
  const connection = connect({ url: address.href, maxConnections: 10 });
  try {
    await migrateToLatest(connection);
    return await work({ url: address.href, connection });
  } finally {
    await connection.close();
    await asAdmin(`drop database if exists "${name}" with (force)`);
  }
}
