import { and, eq, lte, or, sql } from 'drizzle-orm';
import { rigLeases } from '@/db/schema';
import type { Handle } from './database';

/**
 * Takes or renews the lease of a rig: exactly one process drives it. A new holder gets a higher epoch, which travels to
 * the controller as a fence; the same holder keeps its epoch.
 * @returns the epoch, or null while somebody else's lease runs
 */
export async function takeRigLease(
  db: Handle,
  lease: { labId: string; rigId: string; holder: string; nowUtcMs: number; untilUtcMs: number },
): Promise<number | null> {
  const { labId, rigId, holder, nowUtcMs, untilUtcMs } = lease;
  const mine = eq(rigLeases.holder, holder);
  const rows = await db
    .insert(rigLeases)
    .values({ labId, rigId, holder, epoch: 1, untilAt: untilUtcMs })
    .onConflictDoUpdate({
      target: [rigLeases.labId, rigLeases.rigId],
      set: { holder, untilAt: untilUtcMs, epoch: sql`case when ${mine} then ${rigLeases.epoch} else ${rigLeases.epoch} + 1 end` },
      setWhere: or(mine, lte(rigLeases.untilAt, nowUtcMs)),
    })
    .returning({ epoch: rigLeases.epoch });
  return rows[0]?.epoch ?? null;
}

/** Lets a lease go at once, so that another process need not wait for its end. */
export async function giveRigLease(db: Handle, lease: { labId: string; rigId: string; holder: string; nowUtcMs: number }): Promise<void> {
  await db
    .update(rigLeases)
    .set({ untilAt: lease.nowUtcMs })
    .where(and(eq(rigLeases.labId, lease.labId), eq(rigLeases.rigId, lease.rigId), eq(rigLeases.holder, lease.holder)));
}
