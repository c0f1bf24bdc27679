import { pipeline } from 'node:stream/promises';
import { Readable } from 'node:stream';
import { DatabaseError, type PoolClient, type QueryResult } from 'pg';
import { from as copyFrom, to as copyTo } from 'pg-copy-streams';
import { isKey, timestampOfUtcMs } from '@/db/schema/columns';
import type { SampleBatch, SampleStore } from '../interfaces/sample-store';
import type { Connection } from './database';
import { decodeSamples, encodeSamples, microsecondsOf } from './sample-copy';
import { fullMonths, makeMonths } from './sample-months';
import { summariseFresh, summariseSamples } from './sample-summaries';

/** From this many samples on COPY is worth its statements. */
const copyFromCount = 2000;
/** About 10 ms of work for whoever writes them out. */
const samplesAPage = 5000;
const uniqueViolation = '23505';

/** A batch that cannot be stored: says which sample and why. */
export class UnusableBatchError extends Error {
  override readonly name = 'UnusableBatchError';
}

/** Samples in PostgreSQL: the same instant of a channel is stored once, whatever is sent again. */
export function createSampleStore(connection: Connection): SampleStore {
  const room = new Room(connection.db);
  return {
    append: async (labId, channelId, batch) => {
      if (batch.utcMs.length >= copyFromCount) await room.makeFor(batch.utcMs);
      return connection.bulk((client) => appendSamples(client, { labId, channelId }, batch));
    },
    read: (labId, channelId, window) => connection.bulk((client) => readSamples(client, { labId, channelId }, window)),
    pages: (labId, channelId, window) => pagesOf(connection, { labId, channelId }, window),
  };
}

/** Makes the partitions that many samples need before they come; each is tried once. */
class Room {
  private readonly made = new Set<number>();

  constructor(private readonly db: Connection['db']) {}

  async makeFor(utcMs: Float64Array): Promise<void> {
    if (!utcMs.every(Number.isFinite)) return;
    const months = fullMonths(utcMs).filter((month) => !this.made.has(month));
    await makeMonths(this.db, months);
    for (const month of months) this.made.add(month);
  }
}

const longestWaitMs = 8_000;

interface ChannelKey {
  labId: string;
  channelId: string;
}

/**
 * Appends within the transaction of `client`, all or none.
 * @throws UnusableBatchError for a channel that is not of this lab, unequal lengths, or a number that is not finite
 */
export async function appendSamples(
  client: PoolClient,
  channel: ChannelKey,
  batch: SampleBatch,
): Promise<{ stored: number; known: number }> {
  assertUsable(batch);
  await assertChannel(client, channel);
  const count = batch.utcMs.length;
  if (count === 0) return { stored: 0, known: 0 };
  if (count >= copyFromCount && (await copyFresh(client, channel, batch))) return { stored: count, known: 0 };
  const stored = count < copyFromCount ? await insertFew(client, channel, batch) : await copyAside(client, channel, batch);
  if (stored > 0) await summariseSamples(client, channel, batch.utcMs);
  return { stored, known: count - stored };
}

function assertUsable({ utcMs, value }: SampleBatch): void {
  if (utcMs.length !== value.length)
    throw new UnusableBatchError(`${utcMs.length} instants came with ${value.length} values; each sample has one of both`);
  const bad = utcMs.findIndex((at, index) => !Number.isFinite(at) || !Number.isFinite(value[index]));
  if (bad >= 0)
    throw new UnusableBatchError(
      `sample ${bad + 1} of the batch is (${utcMs[bad]}, ${value[bad]}); instant and value must be finite numbers`,
    );
}

/**
 * In place of a foreign key: the channel is of this lab and stays there until the transaction ends. Who adds to the same channel meanwhile waits, so that
 * its summaries are made of all that is there, but not for ever: whoever asked is told to come again.
 */
export async function assertChannel(client: PoolClient, { labId, channelId }: ChannelKey): Promise<void> {
  // One message of several statements, which takes no parameters: both ids have the form of a UUID.
  const results = isKey(labId) && isKey(channelId) ? await client.query(lockSql(labId, channelId)) : [];
  const [, found] = results as unknown as QueryResult[];
  if (found?.rowCount !== 1) throw new UnusableBatchError(`there is no channel ${channelId} in this lab`);
}

const lockSql = (labId: string, channelId: string) =>
  `set local lock_timeout = '${longestWaitMs}ms';
   select 1 from channels where lab_id = '${labId}' and id = '${channelId}' for no key update;
   set local lock_timeout = default`;

async function insertFew(client: PoolClient, { labId, channelId }: ChannelKey, batch: SampleBatch): Promise<number> {
  const result = await client.query(
    `insert into samples (lab_id, channel_id, at, value)
     select $1, $2, at, value from unnest($3::timestamptz[], $4::double precision[]) as batch (at, value) on conflict do nothing`,
    [labId, channelId, Array.from(batch.utcMs, timestampOfUtcMs), Array.from(batch.value)],
  );
  return result.rowCount ?? 0;
}

/** Where nothing is known yet COPY goes straight into the table, which is twice as fast as to ask for each row. False, with nothing stored, where something is. */
async function copyFresh(client: PoolClient, channel: ChannelKey, batch: SampleBatch): Promise<boolean> {
  if ((await holdsAnyOf(client, channel, batch)) || !(await copyStraight(client, channel, batch))) return false;
  await summariseFresh(client, channel, batch);
  return true;
}

/** Whether the channel has samples between the first and the last instant of the batch. */
async function holdsAnyOf(client: PoolClient, { labId, channelId }: ChannelKey, { utcMs }: SampleBatch): Promise<boolean> {
  let [first, last] = [Infinity, -Infinity];
  for (const at of utcMs) [first, last] = [Math.min(first, at), Math.max(last, at)];
  const found = await client.query('select 1 from samples where lab_id = $1 and channel_id = $2 and at between $3 and $4 limit 1', [
    labId,
    channelId,
    timestampOfUtcMs(first),
    timestampOfUtcMs(last),
  ]);
  return found.rowCount === 1;
}

/** False, with nothing stored, where an instant comes twice in the batch or somebody else has stored it this moment. */
async function copyStraight(client: PoolClient, { labId, channelId }: ChannelKey, batch: SampleBatch): Promise<boolean> {
  await client.query('savepoint before_copy');
  try {
    await pipeline(
      Readable.from(encodeSamples(batch, [labId, channelId])),
      client.query(copyFrom('copy samples (lab_id, channel_id, at, value) from stdin (format binary)')),
    );
    await client.query('release savepoint before_copy');
    return true;
  } catch (error) {
    if (!(error instanceof DatabaseError) || error.code !== uniqueViolation) throw error;
    await client.query('rollback to savepoint before_copy');
    return false;
  }
}

async function copyAside(client: PoolClient, { labId, channelId }: ChannelKey, batch: SampleBatch): Promise<number> {
  await client.query(
    'create temporary table if not exists arriving_samples (at timestamptz not null, value double precision not null) on commit delete rows',
  );
  await client.query('truncate arriving_samples');
  await pipeline(
    Readable.from(encodeSamples(batch)),
    client.query(copyFrom('copy arriving_samples (at, value) from stdin (format binary)')),
  );
  const result = await client.query(
    'insert into samples (lab_id, channel_id, at, value) select $1, $2, at, value from arriving_samples order by at on conflict do nothing',
    [labId, channelId],
  );
  return result.rowCount ?? 0;
}

/** A page is asked for by the instant before it, so that whoever reads slowly keeps no connection and no transaction, and whoever goes away leaves nothing behind. */
async function* pagesOf(
  connection: Connection,
  channel: ChannelKey,
  { fromUtcMs, toUtcMs }: { fromUtcMs: number; toUtcMs: number },
): AsyncGenerator<SampleBatch> {
  for (let from = fromUtcMs; from <= toUtcMs;) {
    const window = { fromUtcMs: from, toUtcMs, most: samplesAPage };
    const page = await connection.bulk((client) => readSamples(client, channel, window));
    if (page.utcMs.length > 0) yield page;
    if (page.utcMs.length < samplesAPage) return;
    from = (microsecondsOf(page.utcMs.at(-1) as number) + 1) / 1000;
  }
}

/** Samples of a channel with `fromUtcMs` ≤ instant ≤ `toUtcMs`, in time order, the first so many. */
async function readSamples(
  client: PoolClient,
  { labId, channelId }: ChannelKey,
  window: { fromUtcMs: number; toUtcMs: number; most?: number },
): Promise<SampleBatch> {
  if (!isKey(labId) || !isKey(channelId)) return { utcMs: new Float64Array(), value: new Float64Array() };
  // COPY takes no parameters: both ids have the form of a UUID (just checked) and the instants are whole microseconds.
  const between = `at between ${instantSql(window.fromUtcMs)} and ${instantSql(window.toUtcMs)}`;
  const stream = client.query(
    copyTo(
      `copy (select at, value from samples where lab_id = '${labId}' and channel_id = '${channelId}' and ${between} order by at limit ${String(window.most ?? 'all')}) to stdout (format binary)`,
    ),
  );
  return decodeSamples(stream);
}

/** Bounds beyond what PostgreSQL can write stand for all time. */
function instantSql(utcMs: number): string {
  if (utcMs <= earliestUtcMs) return `'-infinity'::timestamptz`;
  if (utcMs >= latestUtcMs) return `'infinity'::timestamptz`;
  return `('epoch'::timestamptz + ${microsecondsOf(utcMs)} * interval '1 microsecond')`;
}

const earliestUtcMs = Date.UTC(1, 0, 1);
const latestUtcMs = Date.UTC(9999, 0, 1);
