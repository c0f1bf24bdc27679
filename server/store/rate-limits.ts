import { eq, lte, sql } from 'drizzle-orm';
import { rateLimits } from '@/db/schema';
import { one, type Handle } from './database';

export interface RateRule {
  /** What is counted, for example `sign-in`. */
  name: string;
  limit: number;
  windowS: number;
}

/**
 * Counts one use of `subject` (an address, an account) under a rule. The window begins with the first use and all
 * processes count in the same row. Returns the seconds to wait when the use is over the limit, else null.
 */
export async function countUse(db: Handle, rule: RateRule, use: { subject: string; nowUtcMs: number }): Promise<number | null> {
  const { nowUtcMs } = use;
  const fresh = { bucket: `${rule.name} ${use.subject}`, windowStartAt: nowUtcMs, windowEndAt: nowUtcMs + rule.windowS * 1000, count: 1 };
  const over = lte(rateLimits.windowEndAt, nowUtcMs);
  const row = one(
    await db
      .insert(rateLimits)
      .values(fresh)
      .onConflictDoUpdate({
        target: rateLimits.bucket,
        set: {
          windowStartAt: sql`case when ${over} then excluded.window_start_at else ${rateLimits.windowStartAt} end`,
          windowEndAt: sql`case when ${over} then excluded.window_end_at else ${rateLimits.windowEndAt} end`,
          count: sql`case when ${over} then 1 else ${rateLimits.count} + 1 end`,
        },
      })
      .returning(),
  );
  return row.count <= rule.limit ? null : Math.max(1, Math.ceil((row.windowEndAt - nowUtcMs) / 1000));
}

/** Forgets what was counted, after a sign-in that succeeded. */
export async function forgetUses(db: Handle, rule: RateRule, subject: string): Promise<void> {
  await db.delete(rateLimits).where(eq(rateLimits.bucket, `${rule.name} ${subject}`));
}

/** Takes one use back, after a try that succeeded where only failures shall count. */
export async function giveBackUse(db: Handle, rule: RateRule, subject: string): Promise<void> {
  await db
    .update(rateLimits)
    .set({ count: sql`greatest(0, ${rateLimits.count} - 1)` })
    .where(eq(rateLimits.bucket, `${rule.name} ${subject}`));
}

/** Removes counters whose window is over; returns how many. */
export async function sweepRateLimits(db: Handle, nowUtcMs: number): Promise<number> {
  const gone = await db.delete(rateLimits).where(lte(rateLimits.windowEndAt, nowUtcMs));
  return gone.rowCount ?? 0;
}
