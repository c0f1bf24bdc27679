import { and, asc, eq } from 'drizzle-orm';
import { channelLimits, channels } from '@/db/schema';
import type { ChannelLimit } from '@/shared/alarms/limits';
import { one, type Handle } from './database';

export interface LimitRecord {
  labId: string;
  id: string;
  rigId: string;
  channelId: string;
  channelName: string;
  unit: string;
  limit: ChannelLimit;
  changedAt: number;
  changedBy: string;
}

const columns = {
  ...{ labId: channelLimits.labId, id: channelLimits.id, channelId: channelLimits.channelId, limit: channelLimits.limit },
  ...{ changedAt: channelLimits.changedAt, changedBy: channelLimits.changedBy },
  ...{ rigId: channels.rigId, channelName: channels.name, unit: channels.unit },
};

/** Limits of the channels of a rig. */
export const limitsOfRig = (db: Handle, labId: string, rigId: string): Promise<LimitRecord[]> =>
  db
    .select(columns)
    .from(channelLimits)
    .innerJoin(channels, and(eq(channels.labId, channelLimits.labId), eq(channels.id, channelLimits.channelId)))
    .where(and(eq(channelLimits.labId, labId), eq(channels.rigId, rigId)))
    .orderBy(asc(channels.name), asc(channelLimits.changedAt));

export async function addLimit(
  db: Handle,
  limit: { labId: string; channelId: string; limit: ChannelLimit; changedAt: number; changedBy: string },
): Promise<string> {
  return one(await db.insert(channelLimits).values(limit).returning({ id: channelLimits.id })).id;
}

/** False where the rig has no such limit. */
export async function removeLimit(
  db: Handle,
  { labId, rigId, limitId }: { labId: string; rigId: string; limitId: string },
): Promise<boolean> {
  const [found] = (await limitsOfRig(db, labId, rigId)).filter(({ id }) => id === limitId);
  if (found === undefined) return false;
  await db.delete(channelLimits).where(and(eq(channelLimits.labId, labId), eq(channelLimits.id, limitId)));
  return true;
}
