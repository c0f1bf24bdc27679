import { and, eq, gt, sql, type SQL } from 'drizzle-orm';
import { runs, thinnedStretches } from '@/db/schema';
import { timestampOfUtcMs, utcMsOfTimestamp } from '@/db/schema/columns';
import type { Connection, Handle } from './database';
import { freeStretches, marginUs } from './free-stretches';
import { bucketUs, type Stretch } from './sample-levels';
import { thinnedWithin } from './retention';
import { assertChannel } from './sample-store';
import { microsecondsOf } from './sample-copy';
import { sumsOf } from './sample-summaries';

/** Thins old samples to their summaries, a few at a time. */

interface ChannelOfRig {
  labId: string;
  channelId: string;
  rigId: string;
}

/** As many samples as one transaction takes away: some 0.2 s in which nobody adds to the channel. */
const samplesAtOnce = 20_000;

/** The summaries of a stretch do not count what its samples are: nothing was taken away. */
export class UnsoundSummariesError extends Error {
  override readonly name = 'UnsoundSummariesError';
}

/** Times that runs on the rig need, whose samples stay: with an hour before and after; of one that goes on, all that follows. */
async function keptByRuns(db: Handle, { labId, rigId }: ChannelOfRig): Promise<Stretch[]> {
  const { createdAt, startedAt, endedAt } = runs;
  const found = await db
    .select({ createdAt, startedAt, endedAt })
    .from(runs)
    .where(and(eq(runs.labId, labId), eq(runs.rigId, rigId), eq(runs.rehearsal, false)));
  return found.map((run) => ({
    fromUs: microsecondsOf(Math.min(run.createdAt, run.startedAt ?? Infinity)) - marginUs,
    toUs: run.endedAt === null ? Infinity : microsecondsOf(run.endedAt) + marginUs,
  }));
}

/** The time before the cutoff, from the first bucket of the channel on, without what runs need and what is thinned already. */
async function freeBefore(
  db: Handle,
  channel: ChannelOfRig,
  cutoffUtcMs: number,
): Promise<{ whole: Stretch; gone: Stretch[]; free: Stretch[] } | null> {
  const { labId, channelId } = channel;
  const first = await db.execute<{ at: string }>(
    sql`select at::text from sample_summaries where lab_id = ${labId} and channel_id = ${channelId} and level = 5 order by at limit 1`,
  );
  const [bucket] = first.rows;
  const fromUs = bucket === undefined ? Infinity : microsecondsOf(utcMsOfTimestamp(bucket.at));
  const whole = { fromUs, toUs: Math.floor(microsecondsOf(cutoffUtcMs) / bucketUs) * bucketUs };
  if (whole.fromUs >= whole.toUs) return null;
  const thinned = await thinnedWithin(db, { labId, channelId, fromUtcMs: -Infinity, toUtcMs: Infinity });
  const gone = thinned.map(({ fromUtcMs, toUtcMs }) => ({ fromUs: microsecondsOf(fromUtcMs), toUs: microsecondsOf(toUtcMs) }));
  return { whole, gone, free: freeStretches(whole, [...(await keptByRuns(db, channel)), ...gone]) };
}

export interface WouldGo {
  /** Samples that would be taken away, and from when to when they lie, to 2 s. */
  samples: number;
  fromUtcMs: number | null;
  toUtcMs: number | null;
  /** Samples before the cutoff that stay for the sake of runs. */
  kept: number;
}

const windowOf = ({ fromUs, toUs }: Stretch) => ({ fromUtcMs: fromUs / 1000, toUtcMs: (toUs - 1) / 1000 });

/** What thinning would take away of a channel: exact, and nothing is changed. */
export async function wouldGo(connection: Connection, channel: ChannelOfRig, cutoffUtcMs: number): Promise<WouldGo> {
  const found = await freeBefore(connection.db, channel, cutoffUtcMs);
  if (found === null) return { samples: 0, fromUtcMs: null, toUtcMs: null, kept: 0 };
  const { whole, free } = found;
  const gone = found.gone.flatMap(({ fromUs, toUs }) => (fromUs < whole.toUs ? [{ fromUs, toUs: Math.min(toUs, whole.toUs) }] : []));
  const counts = (await sumsOf(connection, channel, [whole, ...gone, ...free].map(windowOf))).map(({ count }) => count);
  const ofFree = counts.slice(1 + gone.length);
  const [all, thinned, samples] = [counts[0] ?? 0, sumOf(counts.slice(1, 1 + gone.length)), sumOf(ofFree)];
  const full = free.filter((_, index) => (ofFree[index] ?? 0) > 0);
  const first = await bucketAtEnd(connection.db, channel, { stretch: full[0], order: 'asc' });
  const last = await bucketAtEnd(connection.db, channel, { stretch: full.at(-1), order: 'desc' });
  return { samples, fromUtcMs: first, toUtcMs: last === null ? null : last + bucketUs / 1000, kept: all - thinned - samples };
}

/** Where the first or the last bucket of a stretch begins, UTC ms. */
async function bucketAtEnd(
  db: Handle,
  { labId, channelId }: ChannelOfRig,
  { stretch, order }: { stretch: Stretch | undefined; order: 'asc' | 'desc' },
): Promise<number | null> {
  if (stretch === undefined) return null;
  const us = await instantOf(
    db,
    sql`select at::text from sample_summaries where lab_id = ${labId} and channel_id = ${channelId} and level = 0
        and at >= ${at(stretch.fromUs)} and at < ${at(stretch.toUs)} order by at ${sql.raw(order)} limit 1`,
  );
  return us === null ? null : us / 1000;
}

const sumOf = (counts: readonly number[]) => counts.reduce((sum, count) => sum + count, 0);

/**
 * Takes away the next few samples from before the cutoff that no run needs, in one transaction; their summaries stay. Null where there is none.
 * @throws UnsoundSummariesError where the summaries do not count them all: nothing is taken away then
 */
export function thinNext(
  connection: Connection,
  channel: ChannelOfRig,
  { cutoffUtcMs, nowUtcMs, atOnce = samplesAtOnce }: { cutoffUtcMs: number; nowUtcMs: number; atOnce?: number },
): Promise<{ samples: number } | null> {
  return connection.bulk(async (client, db) => {
    await assertChannel(client, channel);
    const found = await freeBefore(db, channel, cutoffUtcMs);
    const next = found === null ? null : await nextOf(db, channel, { free: found.free, atOnce });
    if (next === null) return null;
    const within = sql`lab_id = ${channel.labId} and channel_id = ${channel.channelId} and at >= ${at(next.fromUs)} and at < ${at(next.toUs)}`;
    // Entered first: the trigger that follows deletions leaves the summaries of such stretches alone.
    await enter(db, channel, { ...next, nowUtcMs });
    const samples = (await db.execute(sql`delete from samples where ${within}`)).rowCount ?? 0;
    const summed = await db.execute<{ count: number }>(
      sql`select coalesce(sum(count), 0)::double precision as count from sample_summaries where ${within} and level = 0`,
    );
    const counted = summed.rows[0]?.count ?? 0;
    if (counted !== samples)
      throw new UnsoundSummariesError(`the summaries of a stretch count ${String(counted)} samples where there are ${String(samples)}`);
    await db
      .update(thinnedStretches)
      .set({ samples: sql`${thinnedStretches.samples} + ${samples}`, untold: sql`${thinnedStretches.untold} + ${samples}` })
      .where(and(ofChannel(channel), eq(thinnedStretches.toAt, next.toUs / 1000)));
    return { samples };
  });
}

const at = (us: number): SQL => sql`${timestampOfUtcMs(us / 1000)}::timestamptz`;
const ofChannel = ({ labId, channelId }: ChannelOfRig) => and(eq(thinnedStretches.labId, labId), eq(thinnedStretches.channelId, channelId));

/** Whole buckets from that of the first sample in free time on, with about `atOnce` samples. */
async function nextOf(
  db: Handle,
  { labId, channelId }: ChannelOfRig,
  { free, atOnce }: { free: readonly Stretch[]; atOnce: number },
): Promise<Stretch | null> {
  const own = sql`lab_id = ${labId} and channel_id = ${channelId}`;
  for (const stretch of free) {
    const within = (fromUs: number) => sql`${own} and at >= ${at(fromUs)} and at < ${at(stretch.toUs)}`;
    const first = await instantOf(db, sql`select at::text from samples where ${within(stretch.fromUs)} order by at limit 1`);
    if (first === null) continue;
    const fromUs = Math.floor(first / bucketUs) * bucketUs;
    const after = await instantOf(db, sql`select at::text from samples where ${within(fromUs)} order by at offset ${atOnce} limit 1`);
    if (after !== null) return { fromUs, toUs: Math.max(fromUs + bucketUs, Math.floor(after / bucketUs) * bucketUs) };
    const last = await instantOf(db, sql`select at::text from samples where ${within(fromUs)} order by at desc limit 1`);
    return { fromUs, toUs: (Math.floor((last ?? first) / bucketUs) + 1) * bucketUs };
  }
  return null;
}

async function instantOf(db: Handle, query: SQL): Promise<number | null> {
  const [row] = (await db.execute<{ at: string }>(query)).rows;
  return row === undefined ? null : microsecondsOf(utcMsOfTimestamp(row.at));
}

/** The stretch, joined to the one that ends where it begins. */
async function enter(db: Handle, channel: ChannelOfRig, { fromUs, toUs, nowUtcMs }: Stretch & { nowUtcMs: number }): Promise<void> {
  const [fromAt, toAt] = [fromUs / 1000, toUs / 1000];
  const longer = await db
    .update(thinnedStretches)
    .set({ toAt, thinnedAt: nowUtcMs })
    .where(and(ofChannel(channel), eq(thinnedStretches.toAt, fromAt)));
  if (longer.rowCount === 1) return;
  const { labId, channelId } = channel;
  await db.insert(thinnedStretches).values({ labId, channelId, fromAt, toAt, samples: 0, untold: 0, thinnedAt: nowUtcMs });
}

export interface Untold {
  samples: number;
  fromUtcMs: number;
  toUtcMs: number;
}

/** What was taken away of a channel since this was asked last, which counts as told from now on; null for nothing. */
export async function takeUntold(db: Handle, channel: ChannelOfRig): Promise<Untold | null> {
  const rows = await db
    .select()
    .from(thinnedStretches)
    .where(and(ofChannel(channel), gt(thinnedStretches.untold, 0)))
    .for('update');
  if (rows.length === 0) return null;
  await db
    .update(thinnedStretches)
    .set({ untold: 0 })
    .where(and(ofChannel(channel), gt(thinnedStretches.untold, 0)));
  return {
    samples: rows.reduce((sum, { untold }) => sum + untold, 0),
    fromUtcMs: Math.min(...rows.map(({ fromAt }) => fromAt)),
    toUtcMs: Math.max(...rows.map(({ toAt }) => toAt)),
  };
}
