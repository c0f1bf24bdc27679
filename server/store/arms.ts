import { and, desc, eq, gt, isNull } from 'drizzle-orm';
import { arms } from '@/db/schema';
import { one, type Handle, type Transaction } from './database';

export type Arm = typeof arms.$inferSelect;

/** The longest an arm may last. */
export const longestArmMs = 72 * 3_600_000;

const unended = (labId: string, rigId: string) => and(eq(arms.labId, labId), eq(arms.rigId, rigId), isNull(arms.endedAt));

/** Arms a rig until an instant at most 72 h ahead; an arm that still stood is ended by the new one. */
export async function armRig(
  tx: Transaction,
  arm: {
    labId: string;
    rigId: string;
    name: string;
    note: string;
    armedById: string;
    bootId: string;
    nowUtcMs: number;
    untilUtcMs: number;
  },
): Promise<Arm> {
  const { nowUtcMs, untilUtcMs, ...fields } = arm;
  await tx.update(arms).set({ endedAt: nowUtcMs, endedWhy: 'armed anew' }).where(unended(arm.labId, arm.rigId));
  return one(
    await tx
      .insert(arms)
      .values({ ...fields, fromAt: nowUtcMs, untilAt: untilUtcMs })
      .returning(),
  );
}

/** The arm that holds at `nowUtcMs`, or null. */
export async function currentArm(db: Handle, where: { labId: string; rigId: string; nowUtcMs: number }): Promise<Arm | null> {
  const rows = await db
    .select()
    .from(arms)
    .where(and(unended(where.labId, where.rigId), gt(arms.untilAt, where.nowUtcMs)))
    .orderBy(desc(arms.fromAt))
    .limit(1);
  return rows[0] ?? null;
}

/** The arm that was given last, whether or not it still holds. */
export async function newestArm(db: Handle, where: { labId: string; rigId: string }): Promise<Arm | null> {
  const own = and(eq(arms.labId, where.labId), eq(arms.rigId, where.rigId));
  const rows = await db.select().from(arms).where(own).orderBy(desc(arms.fromAt)).limit(1);
  return rows[0] ?? null;
}

/** Ends the arm that stands, saying why; null when none did. */
export async function endArm(db: Handle, where: { labId: string; rigId: string; nowUtcMs: number; why: string }): Promise<Arm | null> {
  const rows = await db
    .update(arms)
    .set({ endedAt: where.nowUtcMs, endedWhy: where.why })
    .where(and(unended(where.labId, where.rigId), gt(arms.untilAt, where.nowUtcMs)))
    .returning();
  return rows[0] ?? null;
}
