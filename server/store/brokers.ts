import { and, asc, eq, isNull } from 'drizzle-orm';
import { brokers } from '@/db/schema';
import { one, type Handle, type Transaction } from './database';

export type BrokerRecord = typeof brokers.$inferSelect;

export async function insertBroker(
  db: Handle,
  broker: Pick<BrokerRecord, 'labId' | 'rigId' | 'address' | 'userName' | 'password' | 'ca' | 'topics' | 'madeAt' | 'madeBy'>,
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

type BrokerKey = Pick<BrokerRecord, 'labId' | 'rigId' | 'id'>;
const counting = ({ labId, rigId, id }: BrokerKey) =>
  and(eq(brokers.labId, labId), eq(brokers.rigId, rigId), eq(brokers.id, id), isNull(brokers.removedAt));

/** Locked until the transaction ends; null where the rig has none with this id that counts. */
export async function lockBroker(tx: Transaction, broker: BrokerKey): Promise<BrokerRecord | null> {
  const [row] = await tx.select().from(brokers).where(counting(broker)).for('update');
  return row ?? null;
}

/** Nothing was heard of it in its new way. */
export async function reviseBroker(
  tx: Transaction,
  broker: BrokerKey,
  setting: Pick<BrokerRecord, 'address' | 'userName' | 'password' | 'ca' | 'topics'>,
): Promise<BrokerRecord> {
  return one(
    await tx
      .update(brokers)
      .set({ ...setting, status: null })
      .where(counting(broker))
      .returning(),
  );
}

/** In place of one that lay there readable. */
export async function sealPassword(db: Handle, { labId, id, password: readable }: BrokerRecord, password: string): Promise<void> {
  if (readable === null) return;
  await db
    .update(brokers)
    .set({ password })
    .where(and(eq(brokers.labId, labId), eq(brokers.id, id), eq(brokers.password, readable)));
}

/** Null where the rig has none with this id that counts. */
export async function removeBroker(
  db: Handle,
  broker: { labId: string; rigId: string; id: string; at: number; by: string },
): Promise<BrokerRecord | null> {
  const { at, by } = broker;
  const [row] = await db
    .update(brokers)
    .set({ removedAt: at, removedBy: by, userName: null, password: null })
    .where(counting(broker))
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
