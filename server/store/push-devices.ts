import { and, asc, eq, inArray, sql } from 'drizzle-orm';
import { pushSubscriptions } from '@/db/schema';
import { one, type Handle } from './database';

export type PushDeviceRecord = typeof pushSubscriptions.$inferSelect;

/** A browser that takes push messages for whoever is signed in there now; the same one again changes hands. `isNew`: it took none for this account before. */
export async function putPushDevice(
  db: Handle,
  device: Pick<PushDeviceRecord, 'userId' | 'endpoint' | 'p256dh' | 'auth' | 'device' | 'madeAt'>,
): Promise<PushDeviceRecord & { isNew: boolean }> {
  const { userId, p256dh, auth, device: name, madeAt } = device;
  const [before] = await db
    .select({ userId: pushSubscriptions.userId })
    .from(pushSubscriptions)
    .where(eq(pushSubscriptions.endpoint, device.endpoint));
  const set = { userId, p256dh, auth, device: name, madeAt };
  const rows = await db
    .insert(pushSubscriptions)
    .values(device)
    .onConflictDoUpdate({ target: pushSubscriptions.endpoint, set })
    .returning();
  return { ...one(rows), isNew: before?.userId !== userId };
}

export const pushDevicesOf = (db: Handle, userId: string): Promise<PushDeviceRecord[]> =>
  db.select().from(pushSubscriptions).where(eq(pushSubscriptions.userId, userId)).orderBy(asc(pushSubscriptions.madeAt)).limit(20);

export async function countPushDevices(db: Handle, userIds: readonly string[]): Promise<Map<string, number>> {
  if (userIds.length === 0) return new Map();
  const rows = await db
    .select({ userId: pushSubscriptions.userId, count: sql<number>`count(*)::int` })
    .from(pushSubscriptions)
    .where(inArray(pushSubscriptions.userId, [...userIds]))
    .groupBy(pushSubscriptions.userId);
  return new Map(rows.map(({ userId, count }) => [userId, count]));
}

const own = ({ userId, id }: { userId: string; id: string }) => and(eq(pushSubscriptions.userId, userId), eq(pushSubscriptions.id, id));

/** What the browser was called; null where the account has no such one. */
export async function removePushDevice(db: Handle, device: { userId: string; id: string }): Promise<string | null> {
  const rows = await db.delete(pushSubscriptions).where(own(device)).returning({ name: pushSubscriptions.device });
  return rows[0]?.name ?? null;
}

export async function notePushed(db: Handle, device: { userId: string; id: string }, lastSentAt: number): Promise<void> {
  await db.update(pushSubscriptions).set({ lastSentAt }).where(own(device));
}
