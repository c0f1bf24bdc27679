import { and, asc, eq } from 'drizzle-orm';
import type { PoolClient } from 'pg';
import { channels } from '@/db/schema';
import { timestampOfUtcMs } from '@/db/schema/columns';
import type { SampleBatch } from '../interfaces/sample-store';
import { one, type Handle } from './database';

export type ChannelRecord = typeof channels.$inferSelect;

/** The samples of the file hold other values than the channel at the same instants. */
export class ConflictingSamplesError extends Error {
  override readonly name = 'ConflictingSamplesError';
  constructor(readonly atUtcMs: number) {
    super('the channel holds another value at the same instant');
  }
}

/** The channel of that name is of another kind. */
export class UnsuitableChannelError extends Error {
  override readonly name = 'UnsuitableChannelError';
  constructor(readonly channel: ChannelRecord) {
    super('the channel is of another kind');
  }
}

/** @throws ConflictingSamplesError where the channel holds another value at an instant of the batch */
export async function assertSameValues(
  client: PoolClient,
  { labId, channelId }: { labId: string; channelId: string },
  batch: SampleBatch,
): Promise<void> {
  const result = await client.query<{ index: string }>(
    `select batch.index from unnest($3::timestamptz[], $4::double precision[]) with ordinality as batch (at, value, index)
     join samples on samples.lab_id = $1 and samples.channel_id = $2 and samples.at = batch.at
     where samples.value is distinct from batch.value order by batch.index limit 1`,
    [labId, channelId, Array.from(batch.utcMs, timestampOfUtcMs), Array.from(batch.value)],
  );
  const [row] = result.rows;
  if (row !== undefined) throw new ConflictingSamplesError(batch.utcMs[Number(row.index) - 1] as number);
}

export async function findChannel(db: Handle, labId: string, channelId: string): Promise<ChannelRecord | null> {
  const [found] = await db
    .select()
    .from(channels)
    .where(and(eq(channels.labId, labId), eq(channels.id, channelId)));
  return found ?? null;
}

/** Channels of a rig that belong to all its runs. */
export const channelsOfRig = (db: Handle, labId: string, rigId: string): Promise<ChannelRecord[]> =>
  db
    .select()
    .from(channels)
    .where(and(eq(channels.labId, labId), eq(channels.rigId, rigId)))
    .orderBy(asc(channels.name), asc(channels.createdAt));

/** The channel of this name of a rig, or of one run of it; null where there is none. */
export async function findNamedChannel(
  db: Handle,
  { labId, rigId, runId, name }: Pick<WantedChannel, 'labId' | 'rigId' | 'runId' | 'name'>,
): Promise<ChannelRecord | null> {
  const own = await channelsOfRig(db, labId, rigId);
  return own.find((channel) => channel.runId === runId && channel.name === name) ?? null;
}

export interface WantedChannel {
  labId: string;
  rigId: string;
  /** The run the channel belongs to alone; null for a channel of the rig. */
  runId: string | null;
  name: string;
  quantity: string;
  unit: string;
  role: ChannelRecord['role'];
  source: ChannelRecord['source'];
  rateHz?: number | null;
  createdAt: number;
}

/** The channel of this name, made where it is missing; the caller compares unit and source. */
export async function findOrMakeChannel(db: Handle, wanted: WantedChannel): Promise<ChannelRecord> {
  await db.insert(channels).values(wanted).onConflictDoNothing();
  const channel = await findNamedChannel(db, wanted);
  return one(channel === null ? [] : [channel]);
}
