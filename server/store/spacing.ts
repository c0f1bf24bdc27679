import { timestampOfUtcMs } from '@/db/schema/columns';
import type { Connection } from './database';
import { countSamples, type SampleWindow } from './sample-summaries';

export interface Spacing {
  /** The longest time without a sample within the window, its ends counted, s. */
  longestGapS: number;
  /** Half of the samples follow the one before at least as soon, s; null with fewer than two. */
  usualS: number | null;
}

/** Of so many samples each is looked at. */
const mostRead = 40_000;

const parametersOf = ({ labId, channelId, fromUtcMs, toUtcMs }: SampleWindow) => [
  labId,
  channelId,
  timestampOfUtcMs(fromUtcMs),
  timestampOfUtcMs(toUtcMs),
];

/**
 * How the samples of a channel lie within a window. Of many the summaries tell where to look: every gap of 4 s and more is found exactly, a shorter one
 * where it leaves a bucket among the emptiest; how soon samples follow each other is taken from stretches spread over the window.
 */
export async function spacingOf(connection: Connection, window: SampleWindow, exactUpTo = mostRead): Promise<Spacing> {
  const few = (await countSamples(connection, window)) <= exactUpTo;
  const { rows } = await connection.pool.query<{ gap: number | null; usual: number | null }>(few ? ofEach : ofMany, parametersOf(window));
  return { longestGapS: rows[0]?.gap ?? (window.toUtcMs - window.fromUtcMs) / 1000, usualS: rows[0]?.usual ?? null };
}

const ofEach = `with edged as (
    select at, false as edge from samples where lab_id = $1 and channel_id = $2 and at between $3 and $4
    union all select $3::timestamptz, true union all select $4::timestamptz, true),
  gaps as (select edge or lag(edge) over ordered as edge, at - lag(at) over ordered as gap from edged window ordered as (order by at))
  select extract(epoch from max(gap))::double precision as gap,
    extract(epoch from percentile_disc(0.5) within group (order by gap) filter (where not edge))::double precision as usual from gaps`;

/**
 * Buckets of 2 s that begin d after the one before hold a gap longer than d - 2 s and shorter than d + 2 s before their first sample: those whose d is 4 s
 * below the greatest, or less, cannot hold the longest.
 */
const ofMany = `with own as (
    select at, count, at - lag(at) over (order by at) as step from sample_summaries
    where lab_id = $1 and channel_id = $2 and level = 0 and at > $3::timestamptz - interval '2 s' and at <= $4),
  place as (
    (select at, step from own where step > greatest((select max(step) from own) - interval '4 s', interval '2 s') order by step desc limit 100)
    union (select at, step from own order by count, at limit 100)),
  gaps as (
    select gap from place cross join lateral (
      select at - lag(at) over (order by at) as gap from samples
      where lab_id = $1 and channel_id = $2 and at >= greatest($3, place.at - coalesce(place.step, interval '0')) and at <= least($4, place.at + interval '4 s')) as near
    union all select min(at) - $3 from (select at from samples where lab_id = $1 and channel_id = $2 and at between $3 and $4 order by at limit 1) as first
    union all select $4 - max(at) from (select at from samples where lab_id = $1 and channel_id = $2 and at between $3 and $4 order by at desc limit 1) as last),
  spread as (
    select gap from generate_series(0, 63) as part cross join lateral (
      select at - lag(at) over (order by at) as gap from (
        select at from samples where lab_id = $1 and channel_id = $2 and at >= $3::timestamptz + part / 64.0 * ($4::timestamptz - $3) and at <= $4
        order by at limit 64) as few) as stretch)
  select extract(epoch from (select max(gap) from gaps))::double precision as gap,
    extract(epoch from (select percentile_disc(0.5) within group (order by gap) from spread))::double precision as usual`;
