import { and, eq, gt, inArray, lte, or, sql } from 'drizzle-orm';
import { rigLeases } from '@/db/schema';
import type { Handle } from './database';

/**
 * Takes or renews the lease of a rig: exactly one process drives it. A new holder gets a higher epoch, which travels to
 * the controller as a fence; the same holder keeps its epoch. `gone`: a holder that is known to have ended, whose lease need not run out.
 * @returns the epoch, or null while somebody else's lease runs
 */
export async function takeRigLease(
  db: Handle,
  lease: { labId: string; rigId: string; holder: string; nowUtcMs: number; untilUtcMs: number; gone?: string | null },
): Promise<number | null> {
  const { labId, rigId, holder, nowUtcMs, untilUtcMs, gone = null } = lease;
  const mine = eq(rigLeases.holder, holder);
  const ended = gone === null ? undefined : eq(rigLeases.holder, gone);
  const rows = await db
    .insert(rigLeases)
    .values({ labId, rigId, holder, epoch: 1, untilAt: untilUtcMs })
    .onConflictDoUpdate({
      target: [rigLeases.labId, rigLeases.rigId],
      set: { holder, untilAt: untilUtcMs, epoch: sql`case when ${mine} then ${rigLeases.epoch} else ${rigLeases.epoch} + 1 end` },
      setWhere: or(mine, lte(rigLeases.untilAt, nowUtcMs), ended),
    })
    .returning({ epoch: rigLeases.epoch });
  return rows[0]?.epoch ?? null;
}

/**
 * Lifts the epoch of a lease above one that a controller has met elsewhere.
 * @returns the new epoch, or null where the lease is not the holder's any more
 */
export async function raiseRigEpoch(
  db: Handle,
  lease: { labId: string; rigId: string; holder: string; above: number },
): Promise<number | null> {
  const { labId, rigId, holder, above } = lease;
  const rows = await db
    .update(rigLeases)
    .set({ epoch: sql`greatest(${rigLeases.epoch}, ${above}) + 1` })
    .where(and(eq(rigLeases.labId, labId), eq(rigLeases.rigId, rigId), eq(rigLeases.holder, holder)))
    .returning({ epoch: rigLeases.epoch });
  return rows[0]?.epoch ?? null;
}

/** Renews all leases of a holder at once. Returns the rigs that are still its own. */
export async function renewRigLeases(db: Handle, lease: { holder: string; untilUtcMs: number }): Promise<ReadonlySet<string>> {
  const rows = await db
    .update(rigLeases)
    .set({ untilAt: lease.untilUtcMs })
    .where(eq(rigLeases.holder, lease.holder))
    .returning({ rigId: rigLeases.rigId });
  return new Set(rows.map(({ rigId }) => rigId));
}

/** Who has these rigs, and until when. */
export function leasesOf(db: Handle, rigIds: readonly string[]): Promise<{ rigId: string; holder: string; untilUtcMs: number }[]> {
  return db
    .select({ rigId: rigLeases.rigId, holder: rigLeases.holder, untilUtcMs: rigLeases.untilAt })
    .from(rigLeases)
    .where(inArray(rigLeases.rigId, [...rigIds]));
}

/** Rigs that some process drives now. */
export async function drivenRigs(db: Handle, nowUtcMs: number): Promise<ReadonlySet<string>> {
  const rows = await db.select({ rigId: rigLeases.rigId }).from(rigLeases).where(gt(rigLeases.untilAt, nowUtcMs));
  return new Set(rows.map(({ rigId }) => rigId));
}

/** Lets all leases of a holder go at once, so that another process need not wait for their end. */
export async function giveRigLeases(db: Handle, lease: { holder: string; nowUtcMs: number }): Promise<void> {
  await db.update(rigLeases).set({ untilAt: lease.nowUtcMs }).where(eq(rigLeases.holder, lease.holder));
}
