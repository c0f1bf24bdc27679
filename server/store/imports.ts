import { and, asc, eq } from 'drizzle-orm';
import type { PoolClient } from 'pg';
import type * as z from 'zod';
import { channels, importPieces, imports } from '@/db/schema';
import { timestampOfUtcMs } from '@/db/schema/columns';
import type { importMappingSchema, importPreviewSchema, SameInstant } from '@/shared/contracts/data';
import type { SampleBatch } from '../interfaces/sample-store';
import { one, type Connection, type Handle } from './database';
import { makeMonths, monthsOfWindow } from './sample-months';
import { appendSamples } from './sample-store';

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

/**
 * Stores an import, all or nothing: `fill` hands over the batches and may throw, which leaves everything as it was, a
 * channel that was not there included.
 * @throws UnsuitableChannelError where the channel has another source or unit
 * @throws ConflictingSamplesError where an instant is known with another value and such samples are refused
 * @throws FrozenSamplesError where one of them was to be replaced and a frozen evaluation stands on it
 */
export async function storeImport(
  connection: Connection,
  work: {
    labId: string;
    importId: string;
    channel: WantedChannel;
    storedAt: number;
    mapping: z.infer<typeof importMappingSchema>;
    /** What becomes of samples at instants of which the channel holds another value. */
    sameInstant: SameInstant;
    /** Where its samples lie most likely: partitions are made there beforehand. */
    window: { fromUtcMs: number; toUtcMs: number };
    /** What has to be written in the same transaction when all is stored. */
    also?: (handle: Handle, sum: { stored: number; known: number; other: number }) => Promise<void>;
  },
  fill: (take: (batch: SampleBatch) => Promise<void>) => Promise<void>,
): Promise<{ channel: ChannelRecord; stored: number; known: number; other: number }> {
  const { labId, importId, channel: wanted, also, window, sameInstant, ...change } = work;
  await makeMonths(connection.db, monthsOfWindow(window));
  return connection.bulk(async (client, handle) => {
    // Two who commit the same import: the second waits here and then finds it stored.
    await handle
      .select({ id: imports.id })
      .from(imports)
      .where(and(eq(imports.labId, labId), eq(imports.id, importId)))
      .for('update');
    const channel = await findOrMakeChannel(handle, wanted);
    if (channel.source !== wanted.source || channel.unit !== wanted.unit) throw new UnsuitableChannelError(channel);
    const key = { labId, channelId: channel.id };
    const sum = { channel, stored: 0, known: 0, other: 0 };
    await fill(async (batch) => {
      const { stored, known } = await appendSamples(client, key, batch);
      if (known > 0 && sameInstant === 'refuse') await assertSameValues(client, key, batch);
      else if (known > 0)
        sum.other += await settleOthers(
          client,
          { ...key, rigId: channel.rigId, runId: channel.runId },
          { batch, replace: sameInstant === 'replace' },
        );
      sum.stored += stored;
      sum.known += known;
    });
    await changeImport(handle, { labId, importId }, { ...change, state: 'stored', channelId: channel.id });
    await also?.(handle, sum);
    return sum;
  });
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

/** A sample that was to be replaced lies in a run with a frozen evaluation. */
export class FrozenSamplesError extends Error {
  override readonly name = 'FrozenSamplesError';
  constructor(readonly atUtcMs: number) {
    super('a frozen evaluation stands on the sample');
  }
}

/** How many samples of the batch have another value than the channel holds at their instant; `replace`: from then on theirs counts, and the summaries follow by their triggers. */
async function settleOthers(
  client: PoolClient,
  channel: { labId: string; channelId: string; rigId: string; runId: string | null },
  { batch, replace }: { batch: SampleBatch; replace: boolean },
): Promise<number> {
  const { labId, channelId } = channel;
  const other = `samples.lab_id = $1 and samples.channel_id = $2 and samples.at = batch.at and samples.value is distinct from batch.value`;
  const batchRows = `unnest($3::timestamptz[], $4::double precision[]) as batch (at, value)`;
  const own = [labId, channelId, Array.from(batch.utcMs, timestampOfUtcMs), Array.from(batch.value)];
  if (!replace)
    return (await client.query<{ n: number }>(`select count(*)::int as n from samples, ${batchRows} where ${other}`, own)).rows[0]?.n ?? 0;
  const frozen = await client.query<{ ms: number }>(
    `select (extract(epoch from samples.at) * 1000)::double precision as ms from samples, ${batchRows}, runs
     where ${other} and runs.lab_id = $1 and runs.rig_id = $5 and (runs.id = $6::uuid or $6::uuid is null and not runs.rehearsal)
       and samples.at between coalesce(runs.started_at, runs.created_at) and coalesce(runs.ended_at, 'infinity')
       and exists (select 1 from evaluations where evaluations.lab_id = $1 and evaluations.run_id = runs.id and evaluations.frozen_at is not null)
     order by samples.at limit 1`,
    [...own, channel.rigId, channel.runId],
  );
  if (frozen.rows[0] !== undefined) throw new FrozenSamplesError(frozen.rows[0].ms);
  return (await client.query(`update samples set value = batch.value from ${batchRows} where ${other}`, own)).rowCount ?? 0;
}

/** Channels of a rig that belong to all its runs. */
export const channelsOfRig = (db: Handle, labId: string, rigId: string): Promise<ChannelRecord[]> =>
  db
    .select()
    .from(channels)
    .where(and(eq(channels.labId, labId), eq(channels.rigId, rigId)))
    .orderBy(asc(channels.name), asc(channels.createdAt));

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
  const own = (await channelsOfRig(db, wanted.labId, wanted.rigId)).filter(
    (channel) => channel.runId === wanted.runId && channel.name === wanted.name,
  );
  return one(own);
}
