import { and, desc, eq, inArray, isNotNull, isNull, lte, max, ne } from 'drizzle-orm';
import type * as z from 'zod';
import { importMappings, importPieces, imports } from '@/db/schema';
import type { importMappingSchema, importPreviewSchema } from '@/shared/contracts/data';
import { one, type Database, type Handle } from './database';

/** Files that are brought in: what is known of them, and their parts until they lie whole in the object store. */

export type ImportRecord = typeof imports.$inferSelect;

interface ImportKey {
  labId: string;
  importId: string;
}

/** A piece is read as a whole, as text of twice its length. */
const pieceBytes = 1_048_576;
const mostListed = 100;
const mostMoved = 20;

const isFile = ({ labId, importId }: ImportKey) => and(eq(imports.labId, labId), eq(imports.id, importId));
const areItsPieces = ({ labId, importId }: ImportKey) => and(eq(importPieces.labId, labId), eq(importPieces.importId, importId));

export async function beginImport(
  db: Handle,
  file: {
    labId: string;
    runId: string;
    fileName: string;
    /** Length and last change of a file that comes in parts. */
    wantedBytes?: number | null;
    changedAt?: number | null;
    createdAt: number;
    createdBy: string;
  },
): Promise<ImportRecord> {
  return one(
    await db
      .insert(imports)
      .values({ ...file, touchedAt: file.createdAt, state: 'waiting' })
      .returning(),
  );
}

export async function findImport(db: Handle, labId: string, importId: string): Promise<ImportRecord | null> {
  const [found] = await db.select().from(imports).where(isFile({ labId, importId }));
  return found ?? null;
}

/** Files of a run, the newest first; refused ones are nobody's any more. */
export const importsOfRun = (db: Handle, { labId, runId }: { labId: string; runId: string }): Promise<ImportRecord[]> =>
  db
    .select()
    .from(imports)
    .where(and(eq(imports.labId, labId), eq(imports.runId, runId), ne(imports.state, 'refused')))
    .orderBy(desc(imports.createdAt), desc(imports.id))
    .limit(mostListed);

/** What stands against a part of a file. */
export type PartRefusal = { refused: 'state' | 'gone' | 'offset' | 'length'; bytes: number };

/** Adds the next part of a file, or nothing; returns how much has come. */
export async function appendPart(
  db: Database,
  key: ImportKey,
  { offset, part, nowUtcMs }: { offset: number; part: Buffer; nowUtcMs: number },
): Promise<{ refused: null; bytes: number } | PartRefusal> {
  return db.transaction(async (tx) => {
    const [file] = await tx.select().from(imports).where(isFile(key)).for('update');
    if (file === undefined) return { refused: 'gone', bytes: 0 };
    if (file.state !== 'waiting') return { refused: 'state', bytes: file.bytes };
    if (file.bytes !== offset) return { refused: 'offset', bytes: file.bytes };
    const bytes = offset + part.length;
    if (file.wantedBytes !== null && bytes > file.wantedBytes) return { refused: 'length', bytes: file.bytes };
    if (part.length > 0) {
      const [last] = await tx
        .select({ number: max(importPieces.number) })
        .from(importPieces)
        .where(areItsPieces(key));
      const first = (last?.number ?? -1) + 1;
      for (let from = 0; from < part.length; from += pieceBytes)
        await tx.insert(importPieces).values({ ...key, number: first + from / pieceBytes, bytes: part.subarray(from, from + pieceBytes) });
    }
    await tx.update(imports).set({ bytes, touchedAt: nowUtcMs }).where(isFile(key));
    return { refused: null, bytes };
  });
}

/** Forgets what has come of a file, for it comes anew. False where it was stored. */
export async function startOver(db: Database, key: ImportKey, { state, nowUtcMs }: { state: 'waiting' | 'refused'; nowUtcMs: number }) {
  return db.transaction(async (tx) => {
    const nothing = { bytes: 0, wantedBytes: null, sha256: null, preview: null, objectName: null };
    const changed = await tx
      .update(imports)
      .set({ ...nothing, state, touchedAt: nowUtcMs })
      .where(and(isFile(key), ne(imports.state, 'stored')))
      .returning({ id: imports.id });
    if (changed.length === 0) return false;
    await dropPieces(tx, key);
    return true;
  });
}

async function dropPieces(db: Handle, key: ImportKey): Promise<void> {
  await db.delete(importPieces).where(areItsPieces(key));
}

/** What has come of a file, piece by piece. */
export async function* readPieces(db: Handle, key: ImportKey): AsyncGenerator<Buffer> {
  for (let number = 0; ; number += 1) {
    const [piece] = await db
      .select({ bytes: importPieces.bytes })
      .from(importPieces)
      .where(and(areItsPieces(key), eq(importPieces.number, number)));
    if (piece === undefined) return;
    yield piece.bytes;
  }
}

export type ImportChange = Partial<Pick<ImportRecord, 'state' | 'channelId' | 'storedAt'>> & {
  mapping?: z.infer<typeof importMappingSchema>;
};

export async function changeImport(db: Handle, key: ImportKey, change: ImportChange): Promise<void> {
  await db.update(imports).set(change).where(isFile(key));
}

export interface WholeFile {
  touchedAt: number;
  bytes: number;
  sha256: string;
  objectName: string;
  preview: z.infer<typeof importPreviewSchema>;
}

/** The file lies whole in the object store; its parts go. False, with nothing changed, where other bytes have come meanwhile, or the file was stored or thrown away. */
export async function tellReceived(db: Database, key: ImportKey, whole: WholeFile): Promise<boolean> {
  return db.transaction(async (tx) => {
    const changed = await tx
      .update(imports)
      .set({ ...whole, wantedBytes: whole.bytes, state: 'received' })
      .where(and(isFile(key), eq(imports.state, 'waiting'), eq(imports.bytes, whole.bytes)))
      .returning({ id: imports.id });
    if (changed.length === 0) return false;
    await dropPieces(tx, key);
    return true;
  });
}

/** A file from before there was an object store lies there now. */
export async function tellMoved(db: Database, key: ImportKey, objectName: string): Promise<void> {
  await db.transaction(async (tx) => {
    const moved = await tx
      .update(imports)
      .set({ objectName })
      .where(and(isFile(key), isNull(imports.objectName), ne(imports.state, 'waiting')))
      .returning({ id: imports.id });
    if (moved.length > 0) await dropPieces(tx, key);
  });
}

/** Whole files from before there was an object store. */
export const unmovedImports = (db: Handle): Promise<ImportRecord[]> =>
  db
    .select()
    .from(imports)
    .where(and(isNull(imports.objectName), isNotNull(imports.sha256)))
    .limit(mostMoved);

/** Forgets a file that was not stored, with its parts. False where it was stored meanwhile or is gone. */
export async function forgetImport(db: Handle, key: ImportKey): Promise<boolean> {
  const gone = await db
    .delete(imports)
    .where(and(isFile(key), ne(imports.state, 'stored')))
    .returning({ id: imports.id });
  return gone.length > 0;
}

/** Forgets files of which nothing came since then and that were not stored. Returns how many. */
export async function forgetUnfinished(
  db: Handle,
  { states, beforeUtcMs }: { states: Exclude<ImportRecord['state'], 'stored'>[]; beforeUtcMs: number },
): Promise<number> {
  const gone = await db
    .delete(imports)
    .where(and(inArray(imports.state, states), lte(imports.touchedAt, beforeUtcMs)))
    .returning({ id: imports.id });
  return gone.length;
}

export type RememberedMapping = typeof importMappings.$inferSelect;

/** Keeps how a file was read into a channel of a rig, in place of the time before. */
export async function rememberMapping(db: Handle, remembered: RememberedMapping): Promise<void> {
  await db
    .insert(importMappings)
    .values(remembered)
    .onConflictDoUpdate({ target: [importMappings.labId, importMappings.rigId, importMappings.channelName], set: remembered });
}

/** How files were read into the channels of a rig, the last used first. */
export const mappingsOfRig = (db: Handle, labId: string, rigId: string): Promise<RememberedMapping[]> =>
  db
    .select()
    .from(importMappings)
    .where(and(eq(importMappings.labId, labId), eq(importMappings.rigId, rigId)))
    .orderBy(desc(importMappings.usedAt))
    .limit(mostListed);
