import { and, asc, eq, isNull } from 'drizzle-orm';
import { exclusions } from '@/db/schema';
import { one, type Handle } from './database';

export type ExclusionRecord = typeof exclusions.$inferSelect;
export type NewExclusion = Pick<ExclusionRecord, 'labId' | 'runId' | 'startUtcMs' | 'endUtcMs' | 'madeAt' | 'madeBy' | 'reason'>;

export async function insertExclusion(db: Handle, exclusion: NewExclusion): Promise<ExclusionRecord> {
  return one(await db.insert(exclusions).values(exclusion).returning());
}

/** Exclusions of a run, withdrawn ones too, earliest stretch first. */
export function exclusionsOf(db: Handle, { labId, runId }: { labId: string; runId: string }): Promise<ExclusionRecord[]> {
  return db
    .select()
    .from(exclusions)
    .where(and(eq(exclusions.labId, labId), eq(exclusions.runId, runId)))
    .orderBy(asc(exclusions.startUtcMs), asc(exclusions.madeAt), asc(exclusions.id));
}

/** Exclusions of a run that were in force at an instant: an evaluation asked for then gives the same whenever it is computed. */
export async function exclusionsInForce(db: Handle, run: { labId: string; runId: string }, atUtcMs: number): Promise<ExclusionRecord[]> {
  const all = await exclusionsOf(db, run);
  return all.filter(({ madeAt, withdrawnAt }) => madeAt <= atUtcMs && (withdrawnAt === null || withdrawnAt > atUtcMs));
}

export async function findExclusion(db: Handle, labId: string, exclusionId: string): Promise<ExclusionRecord | null> {
  const [found] = await db
    .select()
    .from(exclusions)
    .where(and(eq(exclusions.labId, labId), eq(exclusions.id, exclusionId)));
  return found ?? null;
}

/** Withdraws an exclusion for good; null where none with this id is in force. */
export async function withdrawExclusion(
  db: Handle,
  exclusion: { labId: string; exclusionId: string; at: number; by: string; reason: string },
): Promise<ExclusionRecord | null> {
  const { labId, exclusionId, at, by, reason } = exclusion;
  const [row] = await db
    .update(exclusions)
    .set({ withdrawnAt: at, withdrawnBy: by, withdrawnReason: reason })
    .where(and(eq(exclusions.labId, labId), eq(exclusions.id, exclusionId), isNull(exclusions.withdrawnAt)))
    .returning();
  return row ?? null;
}
