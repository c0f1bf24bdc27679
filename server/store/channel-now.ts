import type { Connection } from './database';
import { coverOf, topLevel, widthUs } from './sample-levels';
import { parametersOf, rowsOfPieces, stretchOf, sumsOf, type SampleWindow } from './sample-summaries';

/** What a channel says now, at a cost that grows neither with what is stored nor with the length of the window. */

interface ChannelKey {
  labId: string;
  channelId: string;
}

/** Devices may be ahead of the server by so much (`read-ndjson.ts`). */
const aheadMs = 60_000;

/** What `scaled_down` of the database divides by, so that no finite value makes a sum overflow. */
const scale = 2 ** 60;

/** So many buckets at least: what is lost of a slope by taking a bucket for a point goes with the square of its share of the window. */
const bucketsOfWindow = 64;

/** The coarsest level with so many buckets in a window; null where the samples themselves are few enough. */
export function levelOfSlope(windowMs: number): number | null {
  let level: number | null = null;
  for (let next = 0; next <= topLevel && (widthUs(next) / 1000) * bucketsOfWindow <= windowMs; next += 1) level = next;
  return level;
}

/**
 * Slope of the least-squares line over the last `windowMs`, in the channel's unit per hour; null for fewer than three samples. Over more than two minutes
 * it is that of means of 64 to 512 buckets, each at its middle, which tells a steady change to 3 in 10 000.
 */
export async function slopePerHOf(
  connection: Connection,
  channel: ChannelKey,
  { utcMs, windowMs }: { utcMs: number; windowMs: number },
): Promise<number | null> {
  const window: SampleWindow = { ...channel, fromUtcMs: utcMs - windowMs, toUtcMs: utcMs + aheadMs };
  const pieces = coverOf(stretchOf(window), levelOfSlope(windowMs)).map((piece) => ({ ...piece, number: 0 }));
  const { rows } = await connection.pool.query<{ slope: number | null }>(
    `with ${rowsOfPieces},
     point as (
       select count::double precision as n, scaled_down(mean) as y,
         (extract(epoch from since - ($5::timestamptz[])[1])::double precision + coalesce(power(8, level), 0)) / 3600 as x
       from bucket),
     middle as (select sum(n) as n, sum(n * x) / sum(n) as x, sum(n * y) / sum(n) as y from point)
     select case when max(middle.n) >= 3 then
       sum(point.n * (point.x - middle.x) * (point.y - middle.y)) / nullif(sum(point.n * (point.x - middle.x) ^ 2), 0) end as slope
     from point cross join middle`,
    parametersOf(window, pieces),
  );
  const slope = rows[0]?.slope ?? null;
  return slope === null ? null : slope * scale;
}

/** Greatest minus least sample of the last `windowMs`, in the channel's unit; null where it holds none. */
export async function spanOf(
  connection: Connection,
  channel: ChannelKey,
  { utcMs, windowMs }: { utcMs: number; windowMs: number },
): Promise<number | null> {
  const [sums] = await sumsOf(connection, channel, [{ fromUtcMs: utcMs - windowMs, toUtcMs: utcMs + aheadMs }]);
  return sums?.least == null || sums.greatest === null ? null : sums.greatest - sums.least;
}

/** Mean of the last `windowMs`, least and greatest of their last `recentMs`; null where either holds nothing. */
export async function extremesAbout(
  connection: Connection,
  channel: ChannelKey,
  { utcMs, windowMs, recentMs }: { utcMs: number; windowMs: number; recentMs: number },
): Promise<{ mean: number; least: number; greatest: number } | null> {
  const toUtcMs = utcMs + aheadMs;
  const [whole, recent] = await sumsOf(connection, channel, [
    { fromUtcMs: utcMs - windowMs, toUtcMs },
    { fromUtcMs: utcMs - recentMs, toUtcMs },
  ]);
  const [mean, least, greatest] = [whole?.mean ?? null, recent?.least ?? null, recent?.greatest ?? null];
  return mean === null || least === null || greatest === null ? null : { mean, least, greatest };
}
