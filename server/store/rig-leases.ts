import { and, eq, gt, inArray, or, sql } from 'drizzle-orm';
import { rigLeases } from '@/db/schema';
import type { Handle } from './database';

/**
 * Exactly one process drives a rig. No wall clock takes a rig away from its driver, neither a server's nor PostgreSQL's: whoever waits for a rig
 * looks whether its lease is renewed, and takes one that has stood still. `until_at`, by PostgreSQL's clock, changes with each renewal and tells
 * everybody else who drives what.
 */

/** Holder of a lease that was given back. */
const NOBODY = '';

/** A lease as it was seen; one that is renewed meanwhile is another. */
export interface SeenLease {
  rigId: string;
  holder: string;
  epoch: number;
  untilUtcMs: number;
}

export const wasGivenBack = ({ holder }: SeenLease): boolean => holder === NOBODY;

/** Why a lease may be taken that somebody else has: its holder has ended, or it was not renewed for its length since it was seen so. */
export type Takeable = { gone: string } | { still: SeenLease };

const untilAfter = (leaseMs: number) => sql`clock_timestamp() + ${leaseMs}::double precision * interval '1 millisecond'`;

const mayTake = (why: Takeable | undefined) => {
  if (why === undefined) return undefined;
  if ('gone' in why) return eq(rigLeases.holder, why.gone);
  const { holder, epoch, untilUtcMs } = why.still;
  return and(eq(rigLeases.holder, holder), eq(rigLeases.epoch, epoch), eq(rigLeases.untilAt, untilUtcMs));
};

/**
 * Takes or renews the lease of a rig. A new holder gets a higher epoch, which travels to the controller as a fence; the same holder keeps its epoch.
 * @returns the epoch, or null while somebody else has the lease
 */
export async function takeRigLease(
  db: Handle,
  lease: { labId: string; rigId: string; holder: string; leaseMs: number; why?: Takeable | undefined },
): Promise<number | null> {
  const { labId, rigId, holder, leaseMs, why } = lease;
  const mine = eq(rigLeases.holder, holder);
  const untilAt = untilAfter(leaseMs);
  const rows = await db
    .insert(rigLeases)
    .values({ labId, rigId, holder, epoch: 1, untilAt })
    .onConflictDoUpdate({
      target: [rigLeases.labId, rigLeases.rigId],
      set: { holder, untilAt, epoch: sql`case when ${mine} then ${rigLeases.epoch} else ${rigLeases.epoch} + 1 end` },
      setWhere: or(mine, eq(rigLeases.holder, NOBODY), mayTake(why)),
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
export async function renewRigLeases(db: Handle, { holder, leaseMs }: { holder: string; leaseMs: number }): Promise<ReadonlySet<string>> {
  const rows = await db
    .update(rigLeases)
    .set({ untilAt: untilAfter(leaseMs) })
    .where(eq(rigLeases.holder, holder))
    .returning({ rigId: rigLeases.rigId });
  return new Set(rows.map(({ rigId }) => rigId));
}

/** The leases of these rigs; one that nobody has had yet has none. */
export async function leasesOf(db: Handle, rigIds: readonly string[]): Promise<SeenLease[]> {
  const { rigId, holder, epoch, untilAt: untilUtcMs } = rigLeases;
  return db
    .select({ rigId, holder, epoch, untilUtcMs })
    .from(rigLeases)
    .where(inArray(rigId, [...rigIds]));
}

/** Rigs that some process drives now. */
export async function drivenRigs(db: Handle): Promise<ReadonlySet<string>> {
  const rows = await db
    .select({ rigId: rigLeases.rigId })
    .from(rigLeases)
    .where(gt(rigLeases.untilAt, sql`clock_timestamp()`));
  return new Set(rows.map(({ rigId }) => rigId));
}

/** Which process drives which rig of a lab now. */
export function driversOf(db: Handle, labId: string): Promise<{ rigId: string; process: string }[]> {
  return db
    .select({ rigId: rigLeases.rigId, process: rigLeases.holder })
    .from(rigLeases)
    .where(and(eq(rigLeases.labId, labId), gt(rigLeases.untilAt, sql`clock_timestamp()`)));
}

/** Lets all leases of a holder go at once, so that another process need not wait. */
export async function giveRigLeases(db: Handle, holder: string): Promise<void> {
  await db
    .update(rigLeases)
    .set({ holder: NOBODY, untilAt: sql`clock_timestamp()` })
    .where(eq(rigLeases.holder, holder));
}
