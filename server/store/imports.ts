import { and, asc, eq } from 'drizzle-orm';
import type { PoolClient } from 'pg';
import type * as z from 'zod';
import { channels, importPieces, imports } from '@/db/schema';
import { timestampOfUtcMs } from '@/db/schema/columns';
import type { importMappingSchema, importPreviewSchema } from '@/shared/contracts/data';
import type { SampleBatch } from '../interfaces/sample-store';
import { one, type Handle } from './database';

export type ImportRecord = typeof imports.$inferSelect;
export type ChannelRecord = typeof channels.$inferSelect;

const pieceBytes = 1_048_576;

export async function beginImport(
  db: Handle,
  file: { labId: string; runId: string; fileName: string; createdAt: number; createdBy: string },
): Promise<ImportRecord> {
  return one(
    await db
      .insert(imports)
      .values({ ...file, state: 'waiting' })
      .returning(),
  );
}

export async function findImport(db: Handle, labId: string, importId: string): Promise<ImportRecord | null> {
  const [found] = await db
    .select()
    .from(imports)
    .where(and(eq(imports.labId, labId), eq(imports.id, importId)));
  return found ?? null;
}

/** Keeps a file as it comes, piece by piece; pieces of an earlier try go first. Returns the number of bytes. */
export async function keepPieces(db: Handle, key: { labId: string; importId: string }, chunks: AsyncIterable<Uint8Array>): Promise<number> {
  await dropPieces(db, key);
  let number = 0;
  let bytes = 0;
  let pending: Uint8Array[] = [];
  let pendingBytes = 0;
  const flush = async () => {
    if (pendingBytes === 0) return;
    await db.insert(importPieces).values({ ...key, number, bytes: Buffer.concat(pending) });
    number += 1;
    pending = [];
    pendingBytes = 0;
  };
  for await (const chunk of chunks) {
    for (let from = 0; from < chunk.length;) {
      const part = chunk.subarray(from, from + pieceBytes - pendingBytes);
      pending.push(part);
      pendingBytes += part.length;
      from += part.length;
      if (pendingBytes === pieceBytes) await flush();
    }
    bytes += chunk.length;
  }
  await flush();
  return bytes;
}

export async function dropPieces(db: Handle, key: { labId: string; importId: string }): Promise<void> {
  await db.delete(importPieces).where(and(eq(importPieces.labId, key.labId), eq(importPieces.importId, key.importId)));
}

/** The kept file, piece by piece. */
export async function* readPieces(db: Handle, key: { labId: string; importId: string }): AsyncGenerator<Buffer> {
  for (let number = 0; ; number += 1) {
    const [piece] = await db
      .select({ bytes: importPieces.bytes })
      .from(importPieces)
      .where(and(eq(importPieces.labId, key.labId), eq(importPieces.importId, key.importId), eq(importPieces.number, number)));
    if (piece === undefined) return;
    yield piece.bytes;
  }
}

export type ImportChange = Partial<Pick<ImportRecord, 'state' | 'bytes' | 'sha256' | 'channelId' | 'storedAt'>> & {
  preview?: z.infer<typeof importPreviewSchema> | null;
  mapping?: z.infer<typeof importMappingSchema>;
};

export async function changeImport(db: Handle, key: { labId: string; importId: string }, change: ImportChange): Promise<void> {
  await db
    .update(imports)
    .set(change)
    .where(and(eq(imports.labId, key.labId), eq(imports.id, key.importId)));
}

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
