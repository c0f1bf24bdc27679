import { chmod, cp, mkdir, mkdtemp, readdir, readFile, rename, rm, stat, writeFile } from 'node:fs/promises';
import { basename, dirname, join, resolve } from 'node:path';
import { sql } from 'drizzle-orm';
import * as z from 'zod';
import { connect, type Connection } from '@/db/connect';
import { sha256Hex } from '../evaluation/sha256';
import { auditHeads } from '../store/audit';
import { filesInUse, type KeptFile } from '../store/files';
import { readAll } from '../ingest/receive-file';
import { unspoilt } from '../ingest/unspoilt';
import type { ServerConfig } from '../interfaces/server-config';
import { endWhatIsGone, otherConnections, tablesOf, wipe } from '../store/whole-database';
import { headsFileName } from './audit-anchor';
import { verifyLabAudit } from './audit-verify';
import { ConfigError, readConfig } from './config';
import { FolderObjects } from './folder-objects';
import { objectsOf } from './objects-of';
import { postgresProgram, postgresEnvironment, runProgram } from './programs';

/**
 * `npm run backup -- FILE` and `npm run restore -- FILE`: one file with the whole database (in PostgreSQL's own archive format), the files
 * that people brought in, and those of the state folder that no database holds: journals of runs and the heads of the audit chains. It opens with `tar`.
 */

const usage = { backup: 'Usage: npm run backup -- FILE', restore: 'Usage: npm run restore -- FILE [--replace]' } as const;
const descriptionName = 'evenfall-backup.json';
const dumpName = 'database.dump';
const stateName = 'state';
const filesName = 'files';
/** Of the state folder; all else there can be made again. */
const keptOfState = ['journal', headsFileName];

const descriptionSchema = z.object({
  formatVersion: z.literal(1),
  at: z.string(),
  /** Rows of each table when the backup was made. */
  rows: z.record(z.string(), z.number()),
  /** SHA-256 (hex) of the dump. */
  dump: z.string(),
  /** What was brought in, under `files/`; backups from before there was an object store have it in the dump. */
  files: z.array(z.object({ name: z.string(), bytes: z.number(), sha256: z.string() })).default([]),
});

export class UnusableBackup extends Error {
  override readonly name = 'UnusableBackup';
}

export type Place = Pick<ServerConfig, 'databaseUrl' | 'stateDir' | 'filesDir' | 's3'>;

export interface KeptCounts {
  rows: number;
  files: number;
  /** Files that the database refers to and that could not be read whole. */
  lost: string[];
}

/** Writes the backup and says what it holds. An earlier file of that name is replaced only by a whole new one. */
export async function backup(file: string, place: Place, nowUtcMs: number): Promise<KeptCounts> {
  const { databaseUrl, stateDir } = place;
  const target = resolve(file);
  const folder = await mkdtemp(join(dirname(target), `.${basename(target)}-`));
  const connection = connect({ url: databaseUrl, maxConnections: 1, statementTimeoutMs: 600_000 });
  try {
    await chmod(folder, 0o700);
    const { rows, used } = await dumpInto(join(folder, dumpName), connection, databaseUrl);
    const { files, lost } = await keepFiles(place, used, { connection, into: join(folder, filesName) });
    await keepState(stateDir, join(folder, stateName));
    const dump = sha256Hex(await readFile(join(folder, dumpName)));
    const description: z.infer<typeof descriptionSchema> = { formatVersion: 1, at: new Date(nowUtcMs).toISOString(), rows, dump, files };
    await writeFile(join(folder, descriptionName), `${JSON.stringify(description, null, 2)}\n`);
    const part = `${target}.part`;
    const names = [descriptionName, dumpName, stateName, filesName];
    await runProgram('tar', ['--create', '--gzip', `--file=${part}`, `--directory=${folder}`, ...names], {});
    await chmod(part, 0o600);
    await rename(part, target);
    return { rows: Object.values(rows).reduce((sum, count) => sum + count, 0), files: files.length, lost };
  } finally {
    await connection.close();
    await rm(folder, { recursive: true, force: true });
  }
}

/** Dump and counts see the database at one and the same instant, whatever a server writes meanwhile. */
function dumpInto(path: string, { db }: Connection, databaseUrl: string): Promise<{ rows: Record<string, number>; used: KeptFile[] }> {
  return db.transaction(
    async (tx) => {
      const snapshot = (await tx.execute<{ id: string }>(sql`select pg_export_snapshot() as id`)).rows[0]?.id ?? '';
      const options = ['--format=custom', '--no-owner', '--no-privileges', `--snapshot=${snapshot}`, `--file=${path}`];
      await runProgram(postgresProgram('pg_dump'), options, postgresEnvironment(databaseUrl));
      return { rows: Object.fromEntries(await tablesOf(tx)), used: await filesInUse(tx) };
    },
    { isolationLevel: 'repeatable read', accessMode: 'read only' },
  );
}

/** Files never change, so they may be copied after the dump; one that was thrown away meanwhile is not missed. */
async function keepFiles(
  place: Place,
  used: readonly KeptFile[],
  { connection, into }: { connection: Connection; into: string },
): Promise<{ files: KeptFile[]; lost: string[] }> {
  await mkdir(into, { recursive: true });
  const [from, to] = [objectsOf(place), new FolderObjects(into)];
  const files: KeptFile[] = [];
  const missed: string[] = [];
  try {
    for (const file of used)
      await to.put(file.name, unspoilt(from.read(file.name), file), file).then(
        () => files.push(file),
        () => missed.push(file.name),
      );
  } finally {
    from.close();
  }
  const still = new Set(missed.length === 0 ? [] : (await filesInUse(connection.db)).map(({ name }) => name));
  return { files, lost: missed.filter((name) => still.has(name)) };
}

async function keepState(stateDir: string, into: string): Promise<void> {
  await mkdir(into, { recursive: true });
  for (const name of keptOfState)
    if (await isThere(join(stateDir, name))) await cp(join(stateDir, name), join(into, name), { recursive: true });
}

const isThere = (path: string): Promise<boolean> =>
  stat(path).then(
    () => true,
    () => false,
  );

export interface Restored {
  at: string;
  labs: { name: string; entries: number }[];
  /** Arms that stood in the backup: none stands now. */
  armsEnded: number;
}

/**
 * Puts a backup in place of what the database and the state folder hold.
 * @throws UnusableBackup when the file is none, a server still runs, or the database is not empty and `replace` was not asked for
 */
export async function restore(
  file: string,
  place: Place,
  { replace = false, nowUtcMs }: { replace?: boolean; nowUtcMs: number },
): Promise<Restored> {
  const { databaseUrl, stateDir } = place;
  const folder = await mkdtemp(join(dirname(resolve(file)), '.evenfall-restore-'));
  const connection = connect({ url: databaseUrl, maxConnections: 1, statementTimeoutMs: 600_000 });
  try {
    await chmod(folder, 0o700);
    const description = await unpack(resolve(file), folder);
    if ((await otherConnections(connection.db)) > 0)
      throw new UnusableBackup('something is connected to the database, a server of Evenfall most likely: end it first');
    const before = await tablesOf(connection.db);
    if (before.some(([, count]) => count > 0)) {
      if (!replace)
        throw new UnusableBackup(
          'the database is not empty. With --replace everything in it is thrown away and the backup takes its place',
        );
    }
    await wipe(connection.db);
    const env = postgresEnvironment(databaseUrl);
    const options = ['--no-owner', '--no-privileges', '--exit-on-error', '--single-transaction', `--dbname=${env.PGDATABASE ?? ''}`];
    await runProgram(postgresProgram('pg_restore'), [...options, join(folder, dumpName)], env);
    const tables = await cameBack(connection, description);
    const armsEnded = await endWhatIsGone(connection.db, { tables, nowUtcMs, sha256: sha256Hex });
    await putFiles(place, description.files, join(folder, filesName));
    await putState(join(folder, stateName), stateDir);
    return { at: description.at, labs: await followChains(connection), armsEnded };
  } finally {
    await connection.close();
    await rm(folder, { recursive: true, force: true });
  }
}

async function unpack(file: string, folder: string): Promise<z.infer<typeof descriptionSchema>> {
  if (!(await isThere(file))) throw new UnusableBackup(`there is no file ${file}`);
  try {
    await runProgram('tar', ['--extract', '--gzip', '--no-same-owner', `--file=${file}`, `--directory=${folder}`], {});
    const description = descriptionSchema.parse(JSON.parse(await readFile(join(folder, descriptionName), 'utf8')));
    const from = new FolderObjects(join(folder, filesName));
    for (const kept of description.files) await readAll(unspoilt(from.read(kept.name), kept));
    if (sha256Hex(await readFile(join(folder, dumpName))) === description.dump) return description;
  } catch {
    // Said below.
  }
  throw new UnusableBackup(`${file} is no whole backup of Evenfall`);
}

async function putFiles(place: Place, files: readonly KeptFile[], folder: string): Promise<void> {
  const [from, to] = [new FolderObjects(folder), objectsOf(place)];
  try {
    for (const file of files) await to.put(file.name, from.read(file.name), file);
  } finally {
    to.close();
  }
}

async function putState(from: string, stateDir: string): Promise<void> {
  await mkdir(stateDir, { recursive: true });
  for (const name of keptOfState) await rm(join(stateDir, name), { recursive: true, force: true });
  for (const name of await readdir(from)) await cp(join(from, name), join(stateDir, name), { recursive: true });
}

/** What was restored is what was kept: as many rows in each table. */
async function cameBack({ db }: Connection, { rows }: z.infer<typeof descriptionSchema>): Promise<ReadonlySet<string>> {
  const now = new Map(await tablesOf(db));
  const lost = Object.entries(rows).filter(([table, count]) => now.get(table) !== count);
  if (lost.length > 0) throw new UnusableBackup(`not all rows came back: ${lost.map(([table]) => table).join(', ')}`);
  return new Set(now.keys());
}

async function followChains({ db }: Connection): Promise<Restored['labs']> {
  const labs: Restored['labs'] = [];
  for (const lab of await auditHeads(db)) {
    const { entries, why } = await verifyLabAudit(db, lab);
    if (why !== null) throw new UnusableBackup(`the audit chain of ${lab.name} is broken in this backup: ${why}`);
    labs.push({ name: lab.name, entries });
  }
  return labs;
}

export interface Output {
  out: (text: string) => void;
  err: (text: string) => void;
}
const toProcess: Output = { out: (text) => process.stdout.write(text), err: (text) => process.stderr.write(text) };

/** The commands; 0, or 2 and a sentence. */
export async function main(
  args: readonly string[],
  environment: Record<string, string | undefined>,
  { output = toProcess, nowUtcMs = Date.now() }: { output?: Output; nowUtcMs?: number } = {},
): Promise<number> {
  const [act, ...rest] = args;
  const files = rest.filter((arg) => !arg.startsWith('--'));
  const [file] = files;
  const unknown = rest.find((arg) => arg.startsWith('--') && !(act === 'restore' && arg === '--replace'));
  if ((act !== 'backup' && act !== 'restore') || file === undefined || files.length > 1 || unknown !== undefined) {
    output.err(`${act === 'restore' ? usage.restore : usage.backup}\n`);
    return 2;
  }
  try {
    const place = readConfig(environment);
    if (act === 'backup') {
      const { lost, ...kept } = await backup(file, place, nowUtcMs);
      output.out(`${JSON.stringify({ file: resolve(file), ...kept })}\n`);
      if (lost.length === 0) return 0;
      output.err(`backup: all else is kept, but these files could not be read whole: ${lost.join(', ')}\n`);
      return 2;
    } else output.out(`${JSON.stringify(await restore(file, place, { replace: rest.includes('--replace'), nowUtcMs }), null, 2)}\n`);
    return 0;
  } catch (error) {
    if (!(error instanceof UnusableBackup) && !(error instanceof ConfigError)) throw error;
    output.err(`${act}: ${error.message}\n`);
    return 2;
  }
}

if (require.main === module) void main(process.argv.slice(2), process.env).then((code) => (process.exitCode = code));
