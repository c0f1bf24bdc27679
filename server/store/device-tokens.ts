import { and, desc, eq, isNull, lt, or } from 'drizzle-orm';
import { deviceTokens } from '@/db/schema';
import type { SampleBatch } from '../interfaces/sample-store';
import { one, type Connection, type Handle } from './database';
import { assertSameValues, ConflictingSamplesError } from './imports';
import { appendSamples } from './sample-store';
import { tellingThinned } from './thinned-error';

export type DeviceTokenRecord = typeof deviceTokens.$inferSelect;

export async function insertDeviceToken(
  db: Handle,
  token: Pick<DeviceTokenRecord, 'labId' | 'rigId' | 'name' | 'tokenHash' | 'channels' | 'madeAt' | 'madeBy'>,
): Promise<DeviceTokenRecord> {
  return one(await db.insert(deviceTokens).values(token).returning());
}

export const deviceTokensOf = (db: Handle, { labId, rigId }: { labId: string; rigId: string }): Promise<DeviceTokenRecord[]> =>
  db
    .select()
    .from(deviceTokens)
    .where(and(eq(deviceTokens.labId, labId), eq(deviceTokens.rigId, rigId)))
    .orderBy(desc(deviceTokens.madeAt));

/** The token, also one that was revoked; null where the rig has none with this id. */
export async function revokeDeviceToken(
  db: Handle,
  token: { labId: string; rigId: string; id: string; at: number; by: string },
): Promise<DeviceTokenRecord | null> {
  const { labId, rigId, id, at, by } = token;
  const own = and(eq(deviceTokens.labId, labId), eq(deviceTokens.rigId, rigId), eq(deviceTokens.id, id));
  await db
    .update(deviceTokens)
    .set({ revokedAt: at, revokedBy: by })
    .where(and(own, isNull(deviceTokens.revokedAt)));
  const [row] = await db.select().from(deviceTokens).where(own);
  return row ?? null;
}

/** The token that counts with this hash. */
export async function deviceTokenByHash(db: Handle, tokenHash: string): Promise<DeviceTokenRecord | null> {
  const [row] = await db
    .select()
    .from(deviceTokens)
    .where(and(eq(deviceTokens.tokenHash, tokenHash), isNull(deviceTokens.revokedAt)));
  return row ?? null;
}

/** Last use is kept to the minute. */
const useStepMs = 60_000;

export async function noteUse(db: Handle, { labId, id }: DeviceTokenRecord, nowUtcMs: number): Promise<void> {
  const stale = or(isNull(deviceTokens.lastUsedAt), lt(deviceTokens.lastUsedAt, nowUtcMs - useStepMs));
  await db
    .update(deviceTokens)
    .set({ lastUsedAt: nowUtcMs })
    .where(and(eq(deviceTokens.labId, labId), eq(deviceTokens.id, id), stale));
}

/** The channel holds another value at an instant of the batch. */
export class ConflictingBatchError extends Error {
  override readonly name = 'ConflictingBatchError';
  constructor(
    readonly channelId: string,
    readonly atUtcMs: number,
  ) {
    super('the channel holds another value at the same instant');
  }
}

/**
 * Stores the batches of one request, all or none; what is stored already is counted and left as it is. Channels are locked in the order of their ids, so that
 * no two requests wait for each other.
 * @throws ConflictingBatchError where an instant is known with another value
 * @throws ThinnedSamplesError where the summaries alone are left of a time
 */
export function storeBatches(
  connection: Connection,
  labId: string,
  batches: readonly (SampleBatch & { channelId: string })[],
): Promise<{ stored: number; known: number }> {
  return tellingThinned(
    connection.bulk(async (client) => {
      const sum = { stored: 0, known: 0 };
      for (const { channelId, ...batch } of [...batches].sort((a, b) => (a.channelId < b.channelId ? -1 : 1))) {
        const { stored, known } = await appendSamples(client, { labId, channelId }, batch);
        if (known > 0) await assertSame(() => assertSameValues(client, { labId, channelId }, batch), channelId);
        sum.stored += stored;
        sum.known += known;
      }
      return sum;
    }),
  );
}

async function assertSame(check: () => Promise<void>, channelId: string): Promise<void> {
  try {
    await check();
  } catch (error) {
    throw error instanceof ConflictingSamplesError ? new ConflictingBatchError(channelId, error.atUtcMs) : error;
  }
}
