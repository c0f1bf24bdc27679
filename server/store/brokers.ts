import { and, asc, eq, isNull } from 'drizzle-orm';
import { brokers } from '@/db/schema';
import { one, type Handle } from './database';

export type BrokerRecord = typeof brokers.$inferSelect;

export async function insertBroker(
  db: Handle,
  broker: Pick<BrokerRecord, 'labId' | 'rigId' | 'address' | 'userName' | 'password' | 'topics' | 'madeAt' | 'madeBy'>,
): Promise<BrokerRecord> {
  return one(await db.insert(brokers).values(broker).returning());
}

/** Those that count. */
export const brokersOf = (db: Handle, { labId, rigId }: { labId: string; rigId: string }): Promise<BrokerRecord[]> =>
  db
    .select()
    .from(brokers)
    .where(and(eq(brokers.labId, labId), eq(brokers.rigId, rigId), isNull(brokers.removedAt)))
    .orderBy(asc(brokers.madeAt));

/** Those that count, of all labs. */
export const allBrokers = (db: Handle): Promise<BrokerRecord[]> => db.select().from(brokers).where(isNull(brokers.removedAt));

/** Null where the rig has none with this id that counts. */
export async function removeBroker(
  db: Handle,
  broker: { labId: string; rigId: string; id: string; at: number; by: string },
): Promise<BrokerRecord | null> {
  const { labId, rigId, id, at, by } = broker;
  const [row] = await db
    .update(brokers)
    .set({ removedAt: at, removedBy: by, userName: null, password: null })
    .where(and(eq(brokers.labId, labId), eq(brokers.rigId, rigId), eq(brokers.id, id), isNull(brokers.removedAt)))
    .returning();
  return row ?? null;
}

export async function tellBrokerStatus(
  db: Handle,
  { labId, id }: BrokerRecord,
  status: NonNullable<BrokerRecord['status']>,
): Promise<void> {
  await db
    .update(brokers)
    .set({ status })
    .where(and(eq(brokers.labId, labId), eq(brokers.id, id)));
}
