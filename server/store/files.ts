import { and, eq, exists, lte, not, sql } from 'drizzle-orm';
import { files, imports } from '@/db/schema';
import type { ObjectFacts } from '../interfaces/object-store';
import type { Handle } from './database';

/** What the database knows of the object store. */

export interface KeptFile extends ObjectFacts {
  name: string;
}

const mostAtOnce = 200;

/** Said before the file is put, so that nothing lies in the store that the database does not know. */
export async function announceFile(db: Handle, { name, bytes, sha256 }: KeptFile, nowUtcMs: number): Promise<void> {
  await db.insert(files).values({ name, bytes, sha256, madeAt: nowUtcMs });
}

const inUse = (db: Handle) =>
  exists(
    db
      .select({ one: sql`1` })
      .from(imports)
      .where(eq(imports.objectName, files.name)),
  );

/** Files that something refers to: what a backup holds. */
export const filesInUse = (db: Handle): Promise<KeptFile[]> =>
  db.select({ name: files.name, bytes: files.bytes, sha256: files.sha256 }).from(files).where(inUse(db)).orderBy(files.name);

/** Files that were announced before then and that nothing refers to. */
export async function filesOfNothing(db: Handle, beforeUtcMs: number): Promise<string[]> {
  const found = await db
    .select({ name: files.name })
    .from(files)
    .where(and(lte(files.madeAt, beforeUtcMs), not(inUse(db))))
    .limit(mostAtOnce);
  return found.map(({ name }) => name);
}

/** The store has it no more. */
export async function forgetFile(db: Handle, name: string): Promise<void> {
  await db.delete(files).where(eq(files.name, name));
}
