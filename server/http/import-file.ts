import type { Readable } from 'node:stream';
import { sniffCsv } from '@/server/ingest/csv-sniff';
import { UnreadableFile } from '@/server/ingest/csv-text';
import { FileTooLarge, FileWatch, inPieces, readAll } from '@/server/ingest/receive-file';
import { unspoilt } from '@/server/ingest/unspoilt';
import { SpoiltObjectError, type ObjectFacts } from '@/server/interfaces/object-store';
import { announceFile } from '@/server/store/files';
import * as store from '@/server/store/import-files';
import type { ImportRecord } from '@/server/store/import-files';
import { findRun, type RunRecord } from '@/server/store/runs-read';
import { ProblemError, notFound } from './problem-error';
import type { Services } from './services';

/** The life of a file from its first byte to the object store. */

export async function loadRun(services: Services, labId: string, runId: string): Promise<RunRecord> {
  const run = await findRun(services.database.db, labId, runId);
  if (run === null) throw notFound('run');
  return run;
}

export async function loadImport(services: Services, labId: string, importId: string): Promise<ImportRecord> {
  const file = await store.findImport(services.database.db, labId, importId);
  if (file === null) throw notFound('import');
  return file;
}

const mibBytes = 1_048_576;
const keyOf = ({ labId, id }: ImportRecord) => ({ labId, importId: id });
const mib = (bytes: number) => `${String(Math.round(bytes / mibBytes))} MiB`;

export const storedAlready = ({ fileName }: ImportRecord): ProblemError =>
  new ProblemError('not-possible-now', `${fileName} is stored already. Begin a new import to read it in another way.`);

export const tooLarge = (fileName: string, { config }: Services): ProblemError =>
  new ProblemError(
    'too-large',
    `${fileName} is larger than ${mib(config.limits.importBytes)}. Cut it into parts, or leave out columns that are not needed.`,
  );

/** Runs need this much, whatever people bring in. */
const reserveBytes = 1024 * mibBytes;

/** Refuses what would fill the disk: while a file goes from the database into the store it is there twice. */
export async function assertRoom(services: Services, fileName: string, bytes: number): Promise<void> {
  const [free, stored] = [await services.freeBytes(), await services.objects.freeBytes()];
  const least = Math.min(free ?? Infinity, stored ?? Infinity);
  if (least >= 2 * bytes + reserveBytes) return;
  throw new ProblemError(
    'no-room',
    `There is no room for ${fileName}: ${mib(least)} of the disk of the server are free, and ${mib(2 * bytes + reserveBytes)} are needed, most of it for runs. Make room there, then send it again.`,
  );
}

const filesAway = (what: string) =>
  new ProblemError('files-away', `${what}: the store of files does not answer as it should. Nothing is lost; try again in a minute.`).after(
    60,
  );

/** The file as it was sent, or as much of it as has come. What is no longer what was sent breaks off before its last piece. */
export async function* bytesOf(services: Services, file: ImportRecord): AsyncGenerator<Uint8Array> {
  const { objectName, sha256, bytes } = file;
  if (objectName === null || sha256 === null) {
    yield* store.readPieces(services.database.db, keyOf(file));
    return;
  }
  try {
    yield* unspoilt(services.objects.read(objectName), { name: objectName, bytes, sha256 });
  } catch (error) {
    services.log.error({ err: error as Error, object: objectName }, 'a file could not be read');
    if (error instanceof SpoiltObjectError)
      throw new ProblemError(
        'unreadable-data',
        `What is kept of ${file.fileName} is not what was sent: its SHA-256 is another. Nothing was stored of it; put the files of a backup back, or send it anew.`,
      );
    throw filesAway(`${file.fileName} cannot be read`);
  }
}

/** Keeps a file that comes at once, looks into its first rows, puts it into the object store. */
export async function receiveWhole(services: Services, file: ImportRecord, content: Readable): Promise<void> {
  const { db } = services.database;
  const key = keyOf(file);
  const nowUtcMs = () => services.clock.utcMs();
  if (!(await store.startOver(db, key, { state: 'waiting', nowUtcMs: nowUtcMs() }))) throw storedAlready(file);
  let bytes = 0;
  try {
    const watch = new FileWatch(services.config.limits.importBytes);
    for await (const part of inPieces(watch.watch(content.iterator({ destroyOnReturn: false })))) {
      const done = await store.appendPart(db, key, { offset: bytes, part, nowUtcMs: nowUtcMs() });
      if (done.refused !== null) throw new ProblemError('not-possible-now', `${file.fileName} was sent anew meanwhile, or thrown away.`);
      bytes = done.bytes;
    }
  } catch (error) {
    if (error instanceof ProblemError) throw error;
    await store.startOver(db, key, { state: 'waiting', nowUtcMs: nowUtcMs() });
    throw error instanceof FileTooLarge ? tooLarge(file.fileName, services) : error;
  }
  await finish(services, file);
}

/** A part, 8 MiB at most, is taken whole or not at all. */
const mostPartBytes = 8 * mibBytes;

/** Takes the next part of a file; after the last one the file is looked into and put into the object store. */
export async function receivePart(services: Services, file: ImportRecord, { offset, content }: { offset: number; content: Readable }) {
  const { fileName, wantedBytes } = file;
  if (file.state !== 'waiting')
    throw new ProblemError('not-possible-now', `${fileName} has come already. Begin a new import to bring another file in.`);
  if (wantedBytes === null)
    throw new ProblemError('not-possible-now', `${fileName} was begun without its length, so it comes at once. Begin it with its length.`);
  const part = await wholePart(content);
  const done = await store.appendPart(services.database.db, keyOf(file), { offset, part, nowUtcMs: services.clock.utcMs() });
  if (done.refused === 'gone') throw notFound('import');
  if (done.refused === 'state') throw new ProblemError('not-possible-now', `${fileName} has come already.`);
  if (done.refused === 'offset')
    throw new ProblemError(
      'not-possible-now',
      `${String(done.bytes)} bytes of ${fileName} have come; the next part begins there, not at ${String(offset)}.`,
      [{ path: 'offset', message: String(done.bytes) }],
    );
  if (done.refused === 'length')
    throw new ProblemError(
      'invalid-input',
      `${fileName} was said to have ${String(wantedBytes)} bytes, and more came. Choose the file anew: it has grown meanwhile, most likely.`,
      [{ path: 'offset', message: 'no more than the length that was said' }],
    );
  if (done.bytes === wantedBytes) await finish(services, file);
}

async function wholePart(content: Readable): Promise<Buffer> {
  const chunks: Uint8Array[] = [];
  try {
    for await (const chunk of new FileWatch(mostPartBytes).watch(content.iterator({ destroyOnReturn: false }))) chunks.push(chunk);
  } catch (error) {
    if (error instanceof FileTooLarge) throw new ProblemError('too-large', `A part of a file may have ${mib(mostPartBytes)} at most.`);
    if ((error as NodeJS.ErrnoException).code === 'ECONNRESET')
      throw new ProblemError('invalid-input', 'The part was cut off on its way; nothing of it was kept. Send it again.');
    throw error;
  }
  return Buffer.concat(chunks);
}

/** All has come: what is no table is refused, all else goes into the object store and its parts go away. */
async function finish(services: Services, file: ImportRecord): Promise<void> {
  const { db } = services.database;
  const key = keyOf(file);
  const watch = new FileWatch(Infinity);
  await readAll(watch.watch(store.readPieces(db, key)), services.breathe);
  const preview = await previewOf(services, file, watch);
  const facts = { bytes: watch.bytes, sha256: watch.sha256() };
  const objectName = await keep(services, file, facts);
  if (await store.tellReceived(db, key, { ...facts, objectName, preview, touchedAt: services.clock.utcMs() })) return;
  const now = await loadImport(services, file.labId, file.id);
  // Two who sent its end: one of them was first.
  if (now.state === 'waiting') throw new ProblemError('not-possible-now', `${file.fileName} was sent anew meanwhile.`);
}

/** Puts the parts of a file into the store under a name of their own, and says which. */
async function keep(services: Services, file: ImportRecord, facts: ObjectFacts): Promise<string> {
  const { db } = services.database;
  const name = `imports/${file.labId}/${file.id}/${services.newId()}`;
  await announceFile(db, { name, ...facts }, services.clock.utcMs());
  try {
    await services.objects.put(name, unspoilt(store.readPieces(db, keyOf(file)), { name, ...facts }), facts);
  } catch (error) {
    services.log.error({ err: error as Error, object: name }, 'a file could not be kept');
    throw filesAway(`${file.fileName} has come but cannot be kept yet`);
  }
  return name;
}

async function previewOf(services: Services, file: ImportRecord, watch: FileWatch) {
  try {
    return sniffCsv(watch.head(), watch.bytes <= watch.head().length);
  } catch (error) {
    if (!(error instanceof UnreadableFile)) throw error;
    await store.startOver(services.database.db, keyOf(file), { state: 'refused', nowUtcMs: services.clock.utcMs() });
    throw new ProblemError('unreadable-data', `${file.fileName}: ${error.message}`);
  }
}

/** A file that was kept before there was an object store goes there. */
export async function moveIntoStore(services: Services, file: ImportRecord): Promise<void> {
  const { sha256, bytes } = file;
  if (sha256 === null) return;
  const objectName = await keep(services, file, { bytes, sha256 });
  await store.tellMoved(services.database.db, keyOf(file), objectName);
}
