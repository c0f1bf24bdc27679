import { and, asc, eq, sql } from 'drizzle-orm';
import { channelLimits, channels } from '@/db/schema';
import { timestampOfUtcMs } from '@/db/schema/columns';
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

export interface ChannelState {
  last: { utcMs: number; value: number } | null;
  /** Least-squares line over the window, in the channel's unit per hour; null for fewer than three samples. */
  slopePerH: number | null;
  /** Mean of the window, least and greatest of its recent part; null where either holds nothing. */
  extremes: { mean: number; least: number; greatest: number } | null;
}

/** What a channel says now. */
export async function channelNow(
  db: Handle,
  channel: { labId: string; channelId: string },
  { utcMs, windowMs, recentMs = windowMs }: { utcMs: number; windowMs: number; recentMs?: number },
): Promise<ChannelState> {
  const own = sql`lab_id = ${channel.labId} and channel_id = ${channel.channelId}`;
  const [from, recent] = [sql`${timestampOfUtcMs(utcMs - windowMs)}::timestamptz`, sql`${timestampOfUtcMs(utcMs - recentMs)}::timestamptz`];
  const lasts = await db.execute<{ ms: number; value: number }>(
    sql`select (extract(epoch from at) * 1000)::double precision as ms, value from samples where ${own} order by at desc limit 1`,
  );
  const sums = await db.execute<{
    count: number;
    slope: number | null;
    mean: number | null;
    least: number | null;
    greatest: number | null;
  }>(
    sql`select count(*)::int as count, regr_slope(value, extract(epoch from at - ${from}) / 3600) as slope, avg(value) as mean,
        min(value) filter (where at > ${recent}) as least, max(value) filter (where at > ${recent}) as greatest
        from samples where ${own} and at > ${from}`,
  );
  const [last, sum] = [lasts.rows[0], sums.rows[0]];
  const { count = 0, slope = null, mean = null, least = null, greatest = null } = sum ?? {};
  return {
    last: last === undefined ? null : { utcMs: last.ms, value: last.value },
    slopePerH: count < 3 ? null : slope,
    extremes: mean === null || least === null || greatest === null ? null : { mean, least, greatest },
  };
}
