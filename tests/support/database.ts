import { execFile } from 'node:child_process';
import { createHash, randomBytes } from 'node:crypto';
import { readdirSync, readFileSync } from 'node:fs';
import { join } from 'node:path';
import { promisify } from 'node:util';
import { Client } from 'pg';
import { connect, type Connection } from '@/db/connect';
import { migrateToLatest } from '@/db/migrate';

const root = join(__dirname, '../..');

/** The address of a PostgreSQL that is ours to make databases in: from the environment, else the private test cluster. */
async function adminUrl(): Promise<string> {
  const given = process.env.EVENFALL_DATABASE_ADMIN_URL;
  if (given !== undefined && given !== '') return given;
  const { stdout } = await promisify(execFile)(process.execPath, [join(root, 'scripts/cluster.mjs'), 'url'], { cwd: root });
  const url = stdout.trim().split('\n').at(-1) ?? '';
  if (!url.startsWith('postgres')) throw new Error(`scripts/cluster.mjs url printed no address: ${stdout}`);
  return url;
}

const urlOf = (admin: string, database: string): string => {
  const url = new URL(admin);
  url.pathname = `/${database}`;
  return url.toString();
};

async function asAdmin<T>(admin: string, work: (client: Client) => Promise<T>): Promise<T> {
  const client = new Client({ connectionString: admin });
  await client.connect();
  try {
    return await work(client);
  } finally {
    await client.end();
  }
}

/** A migrated empty database to copy from, named by the migrations it holds, made once for all test files. */
async function template(admin: string): Promise<string> {
  const migrations = join(root, 'db/migrations');
  const digest = createHash('sha256');
  for (const name of readdirSync(migrations)
    .filter((file) => file.endsWith('.sql'))
    .sort())
    digest.update(name).update(readFileSync(join(migrations, name)));
  const name = `evenfall_template_${digest.digest('hex').slice(0, 16)}`;
  await asAdmin(admin, async (client) => {
    await client.query('select pg_advisory_lock(7401968)');
    const known = await client.query('select 1 from pg_database where datname = $1', [name]);
    if (known.rowCount === 1) return;
    // Built under another name, so that a copy can never be taken from a half-made one.
    await client.query(`drop database if exists "${name}_making" with (force)`);
    await client.query(`create database "${name}_making"`);
    const connection = connect({ url: urlOf(admin, `${name}_making`), maxConnections: 2 });
    await migrateToLatest(connection).finally(() => connection.close());
    await client.query(`alter database "${name}_making" rename to "${name}"`);
  });
  return name;
}

export interface TestDatabase {
  url: string;
  connection: Connection;
  drop(): Promise<void>;
}

/** A fresh migrated database of its own; call `drop` when done. */
export async function freshDatabase(): Promise<TestDatabase> {
  const admin = await adminUrl();
  const from = await template(admin);
  const name = `evenfall_test_${randomBytes(8).toString('hex')}`;
  await asAdmin(admin, async (client) => {
    await client.query('select pg_advisory_lock(7401968)');
    await client.query(`create database "${name}" template "${from}"`);
  });
  const url = urlOf(admin, name);
  const connection = connect({ url, maxConnections: 5 });
  return {
    url,
    connection,
    drop: async () => {
      await connection.close();
      await asAdmin(admin, (client) => client.query(`drop database if exists "${name}" with (force)`));
    },
  };
}

/** One database for the tests of a file (or of a `describe`): made before, dropped after. The result is called inside tests. */
export function databaseOfThisFile(): () => TestDatabase {
  let database: TestDatabase | undefined;
  beforeAll(async () => {
    database = await freshDatabase();
  }, 60_000);
  afterAll(async () => {
    await database?.drop();
  });
  return () => {
    if (database === undefined) throw new Error('the database is made in beforeAll: ask for it inside a test');
    return database;
  };
}
