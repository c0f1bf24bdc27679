import type { PoolClient } from 'pg';
import { timestampOfUtcMs } from '@/db/schema/columns';
import { msOf, type ChannelKey, type Staging } from './import-staging';

/** How the rows of a file, staged in the transaction of `client`, stand to what their channel holds and to a run; asked in SQL. */

/** So many of each kind are told one by one. */
const mostTold = 20;

export interface Comparison {
  /** Samples of the channel from the first to the last row. */
  held: number;
  /** Rows at instants of which the channel holds nothing, the same value, another value. */
  fresh: number;
  equal: number;
  different: number;
}

const nothingHeld = (staging: Staging): Comparison => ({ held: 0, fresh: staging.rows, equal: 0, different: 0 });

/** Rows with what the channel holds at their instants; $1 and $2 are its key, $3 and $4 first and last instant. */
const joined =
  'samples on samples.lab_id = $1 and samples.channel_id = $2 and samples.at = staged_rows.at and samples.at between $3 and $4';

const parametersOf = ({ labId, channelId }: ChannelKey, { firstUtcMs, lastUtcMs }: NonNullable<Staging['span']>) => [
  labId,
  channelId,
  timestampOfUtcMs(firstUtcMs),
  timestampOfUtcMs(lastUtcMs),
];

/** @param channel null where there is none of that name yet */
export async function compareStaged(client: PoolClient, staging: Staging, channel: ChannelKey | null): Promise<Comparison> {
  if (channel === null || staging.span === null) return nothingHeld(staging);
  const own = parametersOf(channel, staging.span);
  const counted = await client.query<{ n: string }>(
    'select count(*) as n from samples where lab_id = $1 and channel_id = $2 and at between $3 and $4',
    own,
  );
  const held = Number(counted.rows[0]?.n);
  if (held === 0) return nothingHeld(staging);
  const { rows } = await client.query<{ equal: string; different: string }>(
    `select count(*) filter (where samples.value = staged_rows.value) as equal, count(*) filter (where samples.value <> staged_rows.value) as different
     from staged_rows join ${joined}`,
    own,
  );
  const [equal, different] = [Number(rows[0]?.equal), Number(rows[0]?.different)];
  return { held, fresh: staging.rows - equal - different, equal, different };
}

export interface DifferingRow {
  row: number;
  utcMs: number;
  stored: number;
  inFile: number;
}

/** The first rows with another value than the channel holds at their instant. */
export async function differingRows(client: PoolClient, staging: Staging, channel: ChannelKey): Promise<DifferingRow[]> {
  if (staging.span === null) return [];
  const { rows } = await client.query<{ row: string; ms: number; stored: number; file: number }>(
    `select staged_rows.row, ${msOf('staged_rows.at')} as ms, samples.value as stored, staged_rows.value as file
     from staged_rows join ${joined} where samples.value <> staged_rows.value order by staged_rows.row limit ${String(mostTold)}`,
    parametersOf(channel, staging.span),
  );
  return rows.map(({ row, ms, stored, file }) => ({ row: Number(row), utcMs: ms, stored, inFile: file }));
}

/** Lets the rows count where the channel holds another value; the summaries follow by their triggers. How many. */
export async function replaceDiffering(client: PoolClient, staging: Staging, channel: ChannelKey): Promise<number> {
  if (staging.span === null) return 0;
  const { rowCount } = await client.query(
    `update samples set value = staged_rows.value from staged_rows
     where samples.lab_id = $1 and samples.channel_id = $2 and samples.at = staged_rows.at and samples.at between $3 and $4
       and samples.value <> staged_rows.value`,
    parametersOf(channel, staging.span),
  );
  return rowCount ?? 0;
}

/** The first differing sample within a run that has a frozen evaluation, UTC ms; null where none is. */
export async function frozenDifference(
  client: PoolClient,
  staging: Staging,
  channel: ChannelKey & { rigId: string; runId: string | null },
): Promise<number | null> {
  if (staging.span === null) return null;
  const { rows } = await client.query<{ ms: number }>(
    `select ${msOf('samples.at')} as ms from staged_rows join ${joined}
     join runs on runs.lab_id = $1 and runs.rig_id = $5 and (runs.id = $6::uuid or $6::uuid is null and not runs.rehearsal)
       and samples.at between coalesce(runs.started_at, runs.created_at) and coalesce(runs.ended_at, 'infinity')
     where samples.value <> staged_rows.value
       and exists (select 1 from evaluations where evaluations.lab_id = $1 and evaluations.run_id = runs.id and evaluations.frozen_at is not null)
     order by samples.at limit 1`,
    [...parametersOf(channel, staging.span), channel.rigId, channel.runId],
  );
  return rows[0]?.ms ?? null;
}

/** Lets the database refuse a row in a time of which the summaries alone are left, also one that would be left out for another reason. */
export async function refuseThinned(client: PoolClient, { labId, channelId }: ChannelKey): Promise<void> {
  await client.query(
    `select refuse_thinned($1, $2, array[bucket_of('2 s', at)], array[bucket_of('2 s', at) + interval '2 s']) from (
       select staged_rows.at from thinned_stretches cross join lateral (
         select at from staged_rows where at >= from_at and at < to_at limit 1) as staged_rows
       where lab_id = $1 and channel_id = $2 limit 1) as met`,
    [labId, channelId],
  );
}

export interface AmongStretch {
  fromUtcMs: number;
  toUtcMs: number;
  /** Fresh rows between the ends. */
  rows: number;
  /** Samples that the channel holds there at other instants than the file. */
  held: number;
}

/** Samples of a channel that follow each other within `closeS` ($5) are one stretch, which may begin before the file and end after it. Made once in a transaction. */
const heldStretches = `insert into held_stretches
  select min(at), max(at), count(*) filter (where apart) from (
    select at, apart, count(*) filter (where parted) over (order by at) as number from (
      select samples.at, staged_rows.at is null as apart, samples.at - lag(samples.at) over (order by samples.at) > $5::double precision * interval '1 s' as parted
      from samples left join staged_rows on staged_rows.at = samples.at
      where samples.lab_id = $1 and samples.channel_id = $2
        and samples.at between $3::timestamptz - $5 * interval '1 s' and $4::timestamptz + $5 * interval '1 s') as held) as numbered
  group by number having count(*) filter (where apart) > 0 and min(at) < max(at)`;

const rowsAmong = `staged_rows join held_stretches on staged_rows.at > held_stretches.since and staged_rows.at < held_stretches.until
  where not exists (select 1 from samples where lab_id = $1 and channel_id = $2 and samples.at = staged_rows.at)`;

/** Stretches of the channel with samples of other instants among which fresh rows fall; with the number of all such rows. */
export async function rowsAmongSamples(
  client: PoolClient,
  staging: Staging,
  { closeS, ...channel }: ChannelKey & { closeS: number },
): Promise<{ rows: number; stretches: AmongStretch[] }> {
  if (staging.span === null) return { rows: 0, stretches: [] };
  await client.query(
    'create temporary table held_stretches (since timestamptz not null, until timestamptz not null, held bigint not null) on commit drop',
  );
  await client.query('create index on staged_rows (at)');
  const own = parametersOf(channel, staging.span);
  await client.query(heldStretches, [...own, closeS]);
  const { rows } = await client.query<{ since: number; until: number; held: string; rows: string; whole: string }>(
    `select ${msOf('since')} as since, ${msOf('until')} as until, held, count(*) as rows, sum(count(*)) over () as whole
     from ${rowsAmong} group by since, until, held order by since limit ${String(mostTold)}`,
    [channel.labId, channel.channelId],
  );
  const stretches = rows.map(({ since, until, held, rows: count }) => ({
    fromUtcMs: since,
    toUtcMs: until,
    rows: Number(count),
    held: Number(held),
  }));
  return { rows: Number(rows[0]?.whole ?? 0), stretches };
}

/** Takes out the fresh rows that `rowsAmongSamples` found before; how many. */
export function leaveOutAmong(staging: Staging, { labId, channelId }: ChannelKey): Promise<number> {
  return staging.leaveOut(`row in (select staged_rows.row from ${rowsAmong})`, [labId, channelId]);
}

export interface Gaps {
  count: number;
  totalS: number;
  longest: { fromUtcMs: number; toUtcMs: number; held: number }[];
}

/** Stretches of more than `longerS` without a row, and what the channel holds in the longest of them, which are told in order of time. */
export async function gapsOfStaged(
  client: PoolClient,
  { longerS, channel }: { longerS: number; channel: ChannelKey | null },
): Promise<Gaps> {
  const { rows } = await client.query<{ since: number; until: number; held: string; n: string; total: number }>(
    `with gaps as (select * from (select lag(at) over (order by at) as since, at as until from staged_rows) as step
       where until - since > $1::double precision * interval '1 s'),
     longest as (select * from gaps order by until - since desc limit ${String(mostTold)})
     select ${msOf('since')} as since, ${msOf('until')} as until,
       (select count(*) from samples where lab_id = $2::uuid and channel_id = $3::uuid and at > since and at < until) as held,
       (select count(*) from gaps) as n, (select extract(epoch from sum(until - since)) from gaps)::double precision as total
     from longest order by longest.since`,
    [longerS, channel?.labId ?? null, channel?.channelId ?? null],
  );
  return {
    count: Number(rows[0]?.n ?? 0),
    totalS: rows[0]?.total ?? 0,
    longest: rows.map(({ since, until, held }) => ({ fromUtcMs: since, toUtcMs: until, held: Number(held) })),
  };
}

/** Rows from before a window and from after it. */
export async function rowsOutside(
  client: PoolClient,
  { fromUtcMs, toUtcMs }: { fromUtcMs: number; toUtcMs: number },
): Promise<{ before: number; after: number }> {
  const { rows } = await client.query<{ before: string; after: string }>(
    'select count(*) filter (where at < $1) as before, count(*) filter (where at > $2) as after from staged_rows',
    [timestampOfUtcMs(fromUtcMs), timestampOfUtcMs(toUtcMs)],
  );
  return { before: Number(rows[0]?.before), after: Number(rows[0]?.after) };
}
