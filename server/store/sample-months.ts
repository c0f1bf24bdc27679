import { sql } from 'drizzle-orm';
import { timestampOfUtcMs } from '@/db/schema/columns';
import type { Database } from './database';
import { isGivenUp } from './failures';

/** Months of samples that have a partition of their own. Samples of other months lie in the default one, which is to stay small. */

/** Nobody makes a table by a few stray instants. */
const enoughOfBatch = 1000;
const enoughOfAll = 10_000;
const dayMs = 86_400_000;

/** First instants (UTC ms) of the months in which at least so many of the instants lie. */
export function fullMonths(utcMs: Float64Array, enough = enoughOfBatch): number[] {
  const days = new Map<number, number>();
  for (const at of utcMs) days.set(Math.floor(at / dayMs), (days.get(Math.floor(at / dayMs)) ?? 0) + 1);
  const months = new Map<number, number>();
  for (const [day, count] of days) {
    const month = monthOf(day * dayMs);
    months.set(month, (months.get(month) ?? 0) + count);
  }
  return [...months].filter(([, count]) => count >= enough).map(([month]) => month);
}

function monthOf(utcMs: number): number {
  const day = new Date(utcMs);
  return Date.UTC(day.getUTCFullYear(), day.getUTCMonth(), 1);
}

/** The months of a window, three at most. */
export function monthsOfWindow({ fromUtcMs, toUtcMs }: { fromUtcMs: number; toUtcMs: number }): number[] {
  const first = new Date(fromUtcMs);
  return [0, 1, 2].map((later) => Date.UTC(first.getUTCFullYear(), first.getUTCMonth() + later, 1)).filter((month) => month <= toUtcMs);
}

/** Makes partitions where they are missing. Those that cannot be had at once, because somebody writes to the default one, are left for the housekeeping. */
export async function makeMonths(db: Database, months: readonly number[]): Promise<void> {
  for (const month of months)
    await whileNobodyWaits(db, (tx) => tx.execute(sql`select make_sample_partitions(${timestampOfUtcMs(month)}::timestamptz, 1)`));
}

/** Makes partitions from a month on, and for every month of which the default one holds many samples. */
export async function settleSamples(db: Database, { nowUtcMs, monthsAhead }: { nowUtcMs: number; monthsAhead: number }): Promise<void> {
  await whileNobodyWaits(db, async (tx) => {
    await tx.execute(sql`select make_sample_partitions(${timestampOfUtcMs(nowUtcMs)}::timestamptz, ${monthsAhead})`);
    await tx.execute(sql`select settle_stray_samples(${enoughOfAll})`);
  });
}

/** Those who write wait while a table is locked, so a lock that is not free soon is given up; what was locked may take its time. */
async function whileNobodyWaits(
  db: Database,
  work: (tx: Parameters<Parameters<Database['transaction']>[0]>[0]) => Promise<unknown>,
): Promise<void> {
  try {
    await db.transaction(async (tx) => {
      await tx.execute(sql`set local lock_timeout = '500ms'`);
      await tx.execute(sql`set local statement_timeout = 0`);
      // One after the other; only whoever locks a table hears what tables others have made meanwhile.
      await tx.execute(sql`select pg_advisory_xact_lock(hashtext('make_sample_partitions'))`);
      await tx.execute(sql`lock table samples in access share mode`);
      await work(tx);
    });
  } catch (error) {
    if (!isGivenUp(error)) throw error;
  }
}
