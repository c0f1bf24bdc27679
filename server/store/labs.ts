import { eq } from 'drizzle-orm';
import { labs } from '@/db/schema';
import { one, type Handle } from './database';

export type Lab = typeof labs.$inferSelect;

async function labById(db: Handle, labId: string): Promise<Lab | null> {
  const rows = await db.select().from(labs).where(eq(labs.id, labId));
  return rows[0] ?? null;
}

export async function createLab(db: Handle, lab: { name: string; timeZone: string; nowUtcMs: number }): Promise<Lab> {
  const { nowUtcMs, ...fields } = lab;
  return one(
    await db
      .insert(labs)
      .values({ ...fields, createdAt: nowUtcMs })
      .returning(),
  );
}

/** The changed lab, or null when there is none with this id. */
export async function changeLab(
  db: Handle,
  labId: string,
  change: { name?: string | undefined; timeZone?: string | undefined },
): Promise<Lab | null> {
  if (change.name === undefined && change.timeZone === undefined) return labById(db, labId);
  const rows = await db.update(labs).set(change).where(eq(labs.id, labId)).returning();
  return rows[0] ?? null;
}
