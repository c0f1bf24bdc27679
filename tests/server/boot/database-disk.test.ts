import { randomBytes } from 'node:crypto';
import { statfsSync } from 'node:fs';
import { tmpdir } from 'node:os';
import pino from 'pino';
import { connect, type Connection } from '@/db/connect';
import { DatabaseDisk } from '@/server/boot/database-disk';
import { fullest } from '@/server/boot/free-disk';
import { databaseOfThisFile } from '@/tests/support/database';

/** The disk of a PostgreSQL that runs on this machine, as far as its role may know of it. */

const database = databaseOfThisFile();
const opened: Connection[] = [];
afterEach(async () => {
  for (const connection of opened.splice(0)) await connection.close();
});

const atOnce = (url: string) => {
  const connection = connect({ url, maxConnections: 1 });
  opened.push(connection);
  return connection;
};

/** The role of an ordinary lab: no superuser, and told nothing of where PostgreSQL keeps its data. */
async function ordinaryRole(): Promise<{ url: string; name: string }> {
  const { pool } = database().connection;
  const name = `evenfall_disk_${randomBytes(6).toString('hex')}`;
  await pool.query(`create role ${name} login password 'ordinary'`);
  const url = new URL(database().url);
  Object.assign(url, { username: name, password: 'ordinary' });
  return { url: url.toString(), name };
}

function diskAt(
  url: string,
  { databaseDir = null, connection = atOnce(url) }: { databaseDir?: string | null; connection?: Connection } = {},
) {
  const said: string[] = [];
  const log = pino({ level: 'warn' }, { write: (line: string) => void said.push(line) });
  return { disk: new DatabaseDisk({ databaseUrl: url, databaseDir }, { database: connection, log }), said };
}

/** As df(1) counts what is left. */
const shareOf = (folder: string) => {
  const { bavail, blocks } = statfsSync(folder);
  return bavail / blocks;
};

test('is found where the role may know it, and goes on being known while the database does not answer', async () => {
  const { url } = database();
  const connection = atOnce(url);
  const { disk, said } = diskAt(url, { connection });
  const { rows } = await connection.pool.query<{ folder: string }>("select current_setting('data_directory') as folder");
  expect(await disk.free()).toBeCloseTo(shareOf(rows[0]?.folder ?? ''), 2);
  Object.assign(connection.pool, { query: () => Promise.reject(new Error('could not extend file: No space left on device')) });
  expect(await disk.free()).toBeCloseTo(shareOf(rows[0]?.folder ?? ''), 2);
  expect(said).toEqual([]);
});

test('is not known to a role that is not told, which the log says once, until it is told or a folder is named', async () => {
  const { url, name } = await ordinaryRole();
  const { disk, said } = diskAt(url);
  expect([await disk.free(), await disk.free()]).toEqual([null, null]);
  expect(said).toEqual([expect.stringContaining('the disk of the database is not watched')]);
  await database().connection.pool.query(`grant pg_read_all_settings to ${name}`);
  expect(await disk.free()).toBeGreaterThan(0);

  const named = diskAt(url, { databaseDir: tmpdir() });
  expect(await named.disk.free()).toBeCloseTo(shareOf(tmpdir()), 2);
  expect(named.said).toEqual([]);
  await database().connection.pool.query(`drop role ${name}`);
});

test('of another machine nothing is guessed from what is on this one', async () => {
  const { disk, said } = diskAt('postgres://evenfall@db.quillfen.example/evenfall', { connection: database().connection });
  expect(await disk.free()).toBeNull();
  expect(said).toHaveLength(1);
});

test('of several disks the fullest is told; one that is not known does not count', async () => {
  const disk = (name: string, part: number | null) => ({ disk: name, free: async () => part });
  expect(await fullest(['/is/not/there'], disk('a', 0.4), disk('b', 0.05), disk('c', null))).toEqual({ disk: 'b', free: 0.05 });
  expect(await fullest([tmpdir()], disk('a', 2))).toMatchObject({ disk: 'the disk of the server' });
  expect(await fullest(['/is/not/there'], disk('c', null))).toBeNull();
});
