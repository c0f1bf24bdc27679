import { and, asc, desc, eq, isNull } from 'drizzle-orm';
import { cautionSignatures, personalLocks } from '@/db/schema';
import { one, type Handle, type Transaction } from './database';

export type LockRow = typeof personalLocks.$inferSelect;
export type SignatureRow = typeof cautionSignatures.$inferSelect;

/** The personal locks on a rig that nobody has lifted, the oldest first. */
export function standingLocks(db: Handle, { labId, rigId }: { labId: string; rigId: string }): Promise<LockRow[]> {
  return db
    .select()
    .from(personalLocks)
    .where(and(eq(personalLocks.labId, labId), eq(personalLocks.rigId, rigId), isNull(personalLocks.liftedAt)))
    .orderBy(asc(personalLocks.setAt), asc(personalLocks.id));
}

/** Stores a lock; false where that person has one on the rig already. */
export async function insertLock(
  tx: Transaction,
  lock: Pick<LockRow, 'id' | 'labId' | 'rigId' | 'userId' | 'name' | 'note' | 'setAt'>,
): Promise<boolean> {
  const rows = await tx.insert(personalLocks).values(lock).onConflictDoNothing().returning({ id: personalLocks.id });
  return rows.length > 0;
}

/** Lifts a lock; null where it does not stand. `why` is given where somebody else lifts it. */
export async function liftLock(
  tx: Transaction,
  lift: { labId: string; rigId: string; lockId: string; by: string; why: string | null; nowUtcMs: number },
): Promise<LockRow | null> {
  const rows = await tx
    .update(personalLocks)
    .set({ liftedAt: lift.nowUtcMs, liftedBy: lift.by, liftedWhy: lift.why })
    .where(
      and(
        eq(personalLocks.labId, lift.labId),
        eq(personalLocks.rigId, lift.rigId),
        eq(personalLocks.id, lift.lockId),
        isNull(personalLocks.liftedAt),
      ),
    )
    .returning();
  return rows[0] ?? null;
}

/** Keeps a signature under the cautions of a rig; signing the same version again keeps the first. */
export async function signCautions(tx: Transaction, signature: SignatureRow): Promise<SignatureRow> {
  const { labId, rigId, userId, version } = cautionSignatures;
  await tx.insert(cautionSignatures).values(signature).onConflictDoNothing();
  return one(
    await tx
      .select()
      .from(cautionSignatures)
      .where(and(eq(labId, signature.labId), eq(rigId, signature.rigId), eq(userId, signature.userId), eq(version, signature.version))),
  );
}

/** Signatures under the cautions of a rig, the newest first. */
export function signaturesOf(db: Handle, { labId, rigId }: { labId: string; rigId: string }): Promise<SignatureRow[]> {
  return db
    .select()
    .from(cautionSignatures)
    .where(and(eq(cautionSignatures.labId, labId), eq(cautionSignatures.rigId, rigId)))
    .orderBy(desc(cautionSignatures.signedAt));
}
