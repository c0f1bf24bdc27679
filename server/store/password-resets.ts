import { and, eq, gt, isNull } from 'drizzle-orm';
import { passwordResets } from '@/db/schema';
import type { Handle } from './database';

/** Keeps the hash of a reset token; earlier tokens of the account that are still open lose their use. */
export async function createPasswordReset(
  db: Handle,
  reset: { userId: string; tokenHash: string; nowUtcMs: number; expiresAtUtcMs: number },
): Promise<void> {
  const { userId, tokenHash, nowUtcMs, expiresAtUtcMs } = reset;
  await db
    .update(passwordResets)
    .set({ usedAt: nowUtcMs })
    .where(and(eq(passwordResets.userId, userId), isNull(passwordResets.usedAt)));
  await db.insert(passwordResets).values({ userId, tokenHash, createdAt: nowUtcMs, expiresAt: expiresAtUtcMs });
}

/** Uses a token up and names its account; null when it is unknown, used or expired. */
export async function takePasswordReset(db: Handle, tokenHash: string, nowUtcMs: number): Promise<string | null> {
  const rows = await db
    .update(passwordResets)
    .set({ usedAt: nowUtcMs })
    .where(and(eq(passwordResets.tokenHash, tokenHash), isNull(passwordResets.usedAt), gt(passwordResets.expiresAt, nowUtcMs)))
    .returning({ userId: passwordResets.userId });
  return rows[0]?.userId ?? null;
}
