import type { SampleSummary } from '@/shared/archive/sample-lines';
import { timestampOfUtcMs } from '@/db/schema/columns';
import type { Connection } from './database';
import { thinnedWithin } from './retention';

const bucketsAPage = 5000;
const msOf = (column: string) => `(extract(epoch from ${column}) * 1000)::double precision`;

/** The buckets of 2 s that are left of a channel where it was thinned, in order of time, a page at a time. Those at the ends of the window are whole. */
export async function* summaryPages(
  { db, pool }: Connection,
  channel: { labId: string; channelId: string },
  window: { fromUtcMs: number; toUtcMs: number },
): AsyncGenerator<SampleSummary[]> {
  for (const stretch of await thinnedWithin(db, { ...channel, ...window })) {
    // The bucket that the window begins in belongs to it.
    let from = Math.max(stretch.fromUtcMs, window.fromUtcMs - 2000 + 0.001);
    for (;;) {
      const { rows } = await pool.query<SampleSummary>(
        `select ${msOf('at')} as "fromUtcMs", count::double precision, mean, least, ${msOf('least_at')} as "leastMs", greatest, ${msOf('greatest_at')} as "greatestMs"
         from sample_summaries where lab_id = $1 and channel_id = $2 and level = 0 and at >= $3 and at < $4 order by at limit ${String(bucketsAPage)}`,
        [
          channel.labId,
          channel.channelId,
          timestampOfUtcMs(from),
          timestampOfUtcMs(Math.min(stretch.toUtcMs, Math.max(from, window.toUtcMs + 0.001))),
        ],
      );
      if (rows.length > 0) yield rows;
      const last = rows.at(-1);
      if (last === undefined || rows.length < bucketsAPage) break;
      from = last.fromUtcMs + 2000;
    }
  }
}
