import type { PoolClient } from 'pg';
import { isKey, timestampOfUtcMs } from '@/db/schema/columns';
import type { SampleBatch } from '../interfaces/sample-store';
import type { Connection } from './database';
import { microsecondsOf } from './sample-copy';
import {
  bucketsOf,
  bucketUs,
  cellsOf,
  coverOf,
  stretchesOf,
  topLevel,
  widthUs,
  type Bucket,
  type Piece,
  type Stretch,
} from './sample-levels';

/** What is asked of samples without reading them all: summaries where buckets lie wholly within the window, samples at its ends. */

interface ChannelKey {
  labId: string;
  channelId: string;
}

export interface SampleWindow extends ChannelKey {
  /** Both ends belong to it. */
  fromUtcMs: number;
  toUtcMs: number;
}

/** So many samples are read themselves for a plot, whose parts are then all alike. */
const mostRead = 40_000;

/** Computes the buckets of these instants anew, within the transaction of `client`, which has to hold the row of the channel. */
export async function summariseSamples(client: PoolClient, channel: ChannelKey, utcMs: Float64Array): Promise<void> {
  await client.query('select summarise_samples($1, $2, $3::timestamptz[], $4::timestamptz[])', ofStretches(channel, stretchesOf(utcMs)));
}

/** Some 18 h. */
const stretchUs = widthUs(topLevel);
const stretchesAtOnce = 50;

/**
 * Computes anew the buckets of level 0 in `own` and, once these are there, those above in `above`. A few stretches at a time and none of them long, so that
 * no statement holds more than two hundred thousand buckets.
 */
export async function summariseStretches(
  client: PoolClient,
  channel: ChannelKey,
  { own, above }: { own: readonly Stretch[]; above: readonly Stretch[] },
): Promise<void> {
  for (const few of inFew(own))
    await client.query('select summarise_level_0($1, $2, $3::timestamptz[], $4::timestamptz[])', ofStretches(channel, few));
  for (const few of inFew(above))
    await client.query('select summarise_above($1, $2, $3::timestamptz[], $4::timestamptz[])', ofStretches(channel, few));
}

function* inFew(stretches: readonly Stretch[]): Generator<Stretch[]> {
  const short = stretches.flatMap(({ fromUs, toUs }) =>
    Array.from({ length: Math.ceil((toUs - fromUs) / stretchUs) }, (_, index) => ({
      fromUs: fromUs + index * stretchUs,
      toUs: Math.min(toUs, fromUs + (index + 1) * stretchUs),
    })),
  );
  for (let from = 0; from < short.length; from += stretchesAtOnce) yield short.slice(from, from + stretchesAtOnce);
}

export const bucketColumns = 'at, count, least, least_at, greatest, greatest_at, mean';

/** An array for each of `bucketColumns`. */
export const bucketParameters = (buckets: readonly Bucket[]): unknown[] => [
  buckets.map(({ fromUs }) => timestampOfUtcMs(fromUs / 1000)),
  buckets.map(({ count }) => count),
  buckets.map(({ least }) => least),
  buckets.map(({ leastMs }) => timestampOfUtcMs(leastMs)),
  buckets.map(({ greatest }) => greatest),
  buckets.map(({ greatestMs }) => timestampOfUtcMs(greatestMs)),
  buckets.map(({ mean }) => mean),
];

/**
 * The same, at a fraction of the cost, for a batch that lies where the channel had no sample between its first and its last instant: only the buckets of
 * these two can hold anything else.
 */
export async function summariseFresh(client: PoolClient, channel: ChannelKey, batch: SampleBatch): Promise<void> {
  let [first, last] = [Infinity, -Infinity];
  for (const at of batch.utcMs) [first, last] = [Math.min(first, at), Math.max(last, at)];
  const ends = Float64Array.of(first, last);
  const endUs = new Set(stretchesOf(ends).flatMap(({ fromUs, toUs }) => [fromUs, toUs - bucketUs]));
  const own = bucketsOf(batch).filter(({ fromUs }) => !endUs.has(fromUs));
  await client.query(
    `insert into sample_summaries select $1::uuid, $2::uuid, 0, * from unnest($3::timestamptz[], $4::bigint[], $5::double precision[], $6::timestamptz[],
       $7::double precision[], $8::timestamptz[], $9::double precision[])
     on conflict (lab_id, channel_id, level, at) do update set count = excluded.count, least = excluded.least, least_at = excluded.least_at,
       greatest = excluded.greatest, greatest_at = excluded.greatest_at, mean = excluded.mean`,
    [channel.labId, channel.channelId, ...bucketParameters(own)],
  );
  await client.query('select summarise_level_0($1, $2, $3::timestamptz[], $4::timestamptz[])', ofStretches(channel, stretchesOf(ends)));
  await client.query(
    'select summarise_above($1, $2, $3::timestamptz[], $4::timestamptz[])',
    ofStretches(channel, stretchesOf(batch.utcMs)),
  );
}

function ofStretches({ labId, channelId }: ChannelKey, stretches: readonly Stretch[]): unknown[] {
  const [froms, tos] = [stretches.map(({ fromUs }) => fromUs), stretches.map(({ toUs }) => toUs)];
  return [labId, channelId, froms.map((us) => timestampOfUtcMs(us / 1000)), tos.map((us) => timestampOfUtcMs(us / 1000))];
}

export interface SampleSum {
  count: number;
  /** In the channel's unit; null without a sample. */
  least: number | null;
  greatest: number | null;
  mean: number | null;
}

const nothing: SampleSum = { count: 0, least: null, greatest: null, mean: null };

/**
 * Rows `(number, level, since, count, least, least_ms, greatest, greatest_ms, mean)` of the pieces in $3 to $6: a sample is a bucket of its own. Of each piece
 * only what lies in it is read, by the key of the table it comes from. Where the summaries alone are left, the buckets of level 0 that a piece of samples
 * touches stand for them, whole.
 */
export const rowsOfPieces = `wanted as (select * from unnest($3::int[], $4::smallint[], $5::timestamptz[], $6::timestamptz[]) as wanted (number, level, since, until)),
  piece as (
    select * from wanted
    union all
    select number, 0, bucket_of('2 s', greatest(since, from_at)), bucket_of('2 s', least(until, to_at) - interval '1 us') + interval '2 s'
    from thinned_stretches join wanted on level is null and from_at < until and to_at > since where lab_id = $1 and channel_id = $2),
  bucket as (
    select piece.number, piece.level, own.at as since, own.count, own.least, (extract(epoch from own.least_at) * 1000)::double precision as least_ms,
      own.greatest, (extract(epoch from own.greatest_at) * 1000)::double precision as greatest_ms, own.mean
    from piece cross join lateral (
      select * from sample_summaries where lab_id = $1 and channel_id = $2 and level = piece.level and at >= piece.since and at < piece.until offset 0) as own
    where piece.level is not null
    union all
    select piece.number, piece.level, own.at, 1, own.value, own.ms, own.value, own.ms, own.value
    from piece cross join lateral (
      select at, value, (extract(epoch from at) * 1000)::double precision as ms from samples
      where lab_id = $1 and channel_id = $2 and at >= piece.since and at < piece.until offset 0) as own
    where piece.level is null)`;

/** Everything before the year 1 and after the year 9999 is as far away as these. */
const clampedUs = (utcMs: number) => microsecondsOf(Math.min(Math.max(utcMs, Date.UTC(1, 0, 1)), Date.UTC(9999, 0, 1)));

export const stretchOf = ({ fromUtcMs, toUtcMs }: Pick<SampleWindow, 'fromUtcMs' | 'toUtcMs'>) => ({
  fromUs: clampedUs(fromUtcMs),
  toUs: clampedUs(toUtcMs) + 1,
});

export const parametersOf = ({ labId, channelId }: ChannelKey, pieces: readonly (Piece & { number: number })[]) => [
  labId,
  channelId,
  pieces.map(({ number }) => number),
  pieces.map(({ level }) => level),
  pieces.map(({ fromUs }) => timestampOfUtcMs(fromUs / 1000)),
  pieces.map(({ toUs }) => timestampOfUtcMs(toUs / 1000)),
];

/** Count, least, greatest and mean of a channel in each of some windows, in their order. */
export async function sumsOf(
  connection: Connection,
  channel: ChannelKey,
  windows: readonly Pick<SampleWindow, 'fromUtcMs' | 'toUtcMs'>[],
): Promise<SampleSum[]> {
  if (!isKey(channel.labId) || !isKey(channel.channelId)) return windows.map(() => nothing);
  const pieces = windows.flatMap((window, number) => coverOf(stretchOf(window)).map((piece) => ({ ...piece, number })));
  const { rows } = await connection.pool.query<SampleSum & { number: number }>(
    `with ${rowsOfPieces}
     select number, sum(count)::double precision as count, min(least) as least, max(greatest) as greatest,
       scaled_up_mean(sum(scaled_down(mean) * count), sum(count)::double precision, min(least), max(greatest)) as mean
     from bucket group by number`,
    parametersOf(channel, pieces),
  );
  const found = new Map(rows.map(({ number, ...sum }) => [number, sum]));
  return windows.map((_, number) => found.get(number) ?? nothing);
}

/** How many samples a channel has within a window. */
export async function countSamples(connection: Connection, window: SampleWindow): Promise<number> {
  const [sum = nothing] = await sumsOf(connection, window, [window]);
  return sum.count;
}

/**
 * The least and the greatest sample of each of at most `cells` parts of a window that holds `total` samples, in order of time: what a plot of that many
 * pixel columns can show, peaks included. Of few samples they are equal parts; of many, parts that buckets fill, no narrower than those of level 0.
 */
export async function extremesOf(
  connection: Connection,
  window: SampleWindow,
  { cells, total }: { cells: number; total: number },
): Promise<{ utcMs: number[]; value: number[] }> {
  const stretch = stretchOf(window);
  const spanUs = stretch.toUs - stretch.fromUs;
  const { level, stepUs } = total <= mostRead ? { level: null, stepUs: Math.ceil(spanUs / cells) } : cellsOf(spanUs, cells);
  const pieces = coverOf(stretch, level).map((piece) => ({ ...piece, number: 0 }));
  // Cells of samples begin with the window, those of buckets where buckets do.
  const origin = level === null ? stretch.fromUs : 0;
  const { rows } = await connection.pool.query<{ least: [number, number]; greatest: [number, number] }>(
    `with ${rowsOfPieces}
     select min(array[least, least_ms]) as least, max(array[greatest, -greatest_ms]) as greatest
     from bucket group by floor(extract(epoch from since - $7::timestamptz) / ($8::double precision / 1e6))`,
    [...parametersOf(window, pieces), timestampOfUtcMs(origin / 1000), stepUs],
  );
  const points = rows.flatMap(({ least, greatest }) => {
    const [low, high] = [
      { ms: least[1], value: least[0] },
      { ms: -greatest[1], value: greatest[0] },
    ];
    return low.ms === high.ms ? [low] : [low, high];
  });
  points.sort((one, other) => one.ms - other.ms);
  return { utcMs: points.map(({ ms }) => ms), value: points.map(({ value }) => value) };
}

/** The last sample of a channel, or null. The newest bucket tells where to look, so that no other month is asked. */
export async function lastSampleOf(connection: Connection, channel: ChannelKey): Promise<{ utcMs: number; value: number } | null> {
  if (!isKey(channel.labId) || !isKey(channel.channelId)) return null;
  const own = [channel.labId, channel.channelId];
  const { rows: buckets } = await connection.pool.query<{ at: string; utcMs: number; value: number }>(
    `select at::text, (extract(epoch from greatest(least_at, greatest_at)) * 1000)::double precision as "utcMs",
       case when least_at > greatest_at then least else greatest end as value
     from sample_summaries where lab_id = $1 and channel_id = $2 and level = 0 order by at desc limit 1`,
    own,
  );
  const [newest] = buckets;
  if (newest === undefined) return null;
  const { rows } = await connection.pool.query<{ utcMs: number; value: number }>(
    `select (extract(epoch from at) * 1000)::double precision as "utcMs", value from samples
     where lab_id = $1 and channel_id = $2 and at >= $3 order by at desc limit 1`,
    [...own, newest.at],
  );
  // Of a channel that was thinned to its end: the last instant that its summaries know.
  return rows[0] ?? { utcMs: newest.utcMs, value: newest.value };
}

export const lastSampleUtcMs = async (connection: Connection, channel: ChannelKey): Promise<number | null> =>
  (await lastSampleOf(connection, channel))?.utcMs ?? null;
