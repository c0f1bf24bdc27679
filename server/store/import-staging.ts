import { pipeline } from 'node:stream/promises';
import { Readable } from 'node:stream';
import type { PoolClient } from 'pg';
import { from as copyFrom } from 'pg-copy-streams';
import { timestampOfUtcMs } from '@/db/schema/columns';
import type { RowBatch } from '../interfaces/sample-store';
import { encodeRows } from './sample-copy';
import { bucketsOf, bucketUs, joinStretches, stretchesOf, type Stretch } from './sample-levels';
import { summariseStretches, bucketColumns, bucketParameters } from './sample-summaries';

/**
 * Rows of a file on their way into a channel, in tables that end with the transaction: while a file is read nobody waits for it, and nothing is left of one
 * that is not stored.
 */

/** Stretches that lie so close are summed up as one: an hour, so that there are few of them however seldom a channel is measured. */
const closeUs = 3_600_000_000;

const tables = `
  create temporary table staged_rows (row bigint not null, at timestamptz not null, value double precision not null) on commit drop;
  create temporary table staged_buckets (at timestamptz not null, count bigint not null, least double precision not null, least_at timestamptz not null,
    greatest double precision not null, greatest_at timestamptz not null, mean double precision not null) on commit drop`;

export interface ChannelKey {
  labId: string;
  channelId: string;
}

/** A value beyond the reach of the pendulum. */
export interface FarValue {
  row: number;
  utcMs: number;
  value: number;
}

export interface FarValues {
  count: number;
  /** The middle value of the file. */
  middle: number;
  /** In order of rows, 100 at most. */
  first: FarValue[];
}

export class Staging {
  private firstMs = Infinity;
  private lastMs = -Infinity;
  private count = 0;
  /** Something was taken out again, so that the sums made on the way do not hold. */
  private thinned = false;
  private stretches: Stretch[] = [];
  /** Buckets at the ends of batches, which may go on in the next one. */
  private edges: Stretch[] = [];

  private constructor(private readonly client: PoolClient) {}

  /** Within the transaction of `client`, once. */
  static async open(client: PoolClient): Promise<Staging> {
    await client.query(tables);
    return new Staging(client);
  }

  get rows(): number {
    return this.count;
  }

  /** First and last instant, UTC ms; null without a row. */
  get span(): { firstUtcMs: number; lastUtcMs: number } | null {
    return this.count === 0 ? null : { firstUtcMs: this.firstMs, lastUtcMs: this.lastMs };
  }

  /** Rows in order of time, no instant twice. */
  readonly take = async (batch: RowBatch): Promise<void> => {
    const [first, last] = [batch.utcMs[0], batch.utcMs.at(-1)];
    if (first === undefined || last === undefined) return;
    await pipeline(
      Readable.from(encodeRows(batch)),
      this.client.query(copyFrom('copy staged_rows (row, at, value) from stdin (format binary)')),
    );
    const ends = stretchesOf(Float64Array.of(first, last));
    const endUs = new Set(ends.flatMap(({ fromUs, toUs }) => [fromUs, toUs - bucketUs]));
    const own = bucketsOf(batch).filter(({ fromUs }) => !endUs.has(fromUs));
    await this.client.query(
      `insert into staged_buckets select * from unnest($1::timestamptz[], $2::bigint[], $3::double precision[], $4::timestamptz[], $5::double precision[],
         $6::timestamptz[], $7::double precision[])`,
      bucketParameters(own),
    );
    this.edges.push(...ends);
    this.stretches = joinStretches([...this.stretches, ...stretchesOf(batch.utcMs)], closeUs);
    [this.firstMs, this.lastMs] = [Math.min(this.firstMs, first), Math.max(this.lastMs, last)];
    this.count += batch.utcMs.length;
  };

  /** Values farther than `reach` from the middle one; null where there is none. */
  async farValues(reach: number): Promise<FarValues | null> {
    const ends = await this.one<{ least: number | null; greatest: number | null }>(
      'select min(value) as least, max(value) as greatest from staged_rows',
    );
    if (ends.least === null || ends.greatest === null || ends.greatest - ends.least <= reach) return null;
    const { middle } = await this.one<{ middle: number }>(
      'select percentile_disc(0.5) within group (order by value) as middle from staged_rows',
    );
    const { rows } = await this.client.query<{ row: string; ms: number; value: number; n: string }>(
      `select row, ${msOf('at')} as ms, value, count(*) over () as n from staged_rows where value not between $1 and $2 order by row limit 100`,
      [middle - reach, middle + reach],
    );
    const first = rows.map(({ row, ms, value }) => ({ row: Number(row), utcMs: ms, value }));
    return first.length === 0 ? null : { count: Number(rows[0]?.n), middle, first };
  }

  /** Takes out the values farther than `reach` from the middle one; how many. */
  leaveOutFar({ middle }: FarValues, reach: number): Promise<number> {
    return this.leaveOut('value not between $1 and $2', [middle - reach, middle + reach]);
  }

  /** Takes out what does not lie within the window; how many rows. */
  leaveOutside({ fromUtcMs, toUtcMs }: { fromUtcMs: number; toUtcMs: number }): Promise<number> {
    return this.leaveOut('at not between $1 and $2', [timestampOfUtcMs(fromUtcMs), timestampOfUtcMs(toUtcMs)]);
  }

  /** Takes out the rows for which a condition holds; how many. */
  async leaveOut(condition: string, parameters: unknown[]): Promise<number> {
    const { rowCount } = await this.client.query(`delete from staged_rows where ${condition}`, parameters);
    if (rowCount === null || rowCount === 0) return 0;
    this.thinned = true;
    const { n, first, last } = await this.one<{ n: string; first: number | null; last: number | null }>(
      `select count(*) as n, min(${msOf('at')}) as first, max(${msOf('at')}) as last from staged_rows`,
    );
    [this.count, this.firstMs, this.lastMs] = [Number(n), first ?? Infinity, last ?? -Infinity];
    return rowCount;
  }

  /** All rows into a channel that holds nothing from the first to the last of them. */
  async storeFresh({ labId, channelId }: ChannelKey): Promise<number> {
    const { rowCount } = await this.client.query(
      'insert into samples (lab_id, channel_id, at, value) select $1, $2, at, value from staged_rows',
      [labId, channelId],
    );
    if (this.thinned) await this.summarise({ labId, channelId });
    else {
      await this.client.query(
        `insert into sample_summaries (lab_id, channel_id, level, ${bucketColumns}) select $1::uuid, $2::uuid, 0, ${bucketColumns} from staged_buckets`,
        [labId, channelId],
      );
      await summariseStretches(this.client, { labId, channelId }, { own: joinStretches(this.edges, 0), above: this.stretches });
    }
    return rowCount ?? 0;
  }

  /** The rows of whose instants the channel holds nothing yet. */
  async storeUnknown({ labId, channelId }: ChannelKey): Promise<number> {
    const { rowCount } = await this.client.query(
      'insert into samples (lab_id, channel_id, at, value) select $1, $2, at, value from staged_rows on conflict do nothing',
      [labId, channelId],
    );
    if (rowCount !== null && rowCount > 0) await this.summarise({ labId, channelId });
    return rowCount ?? 0;
  }

  private summarise(channel: ChannelKey): Promise<void> {
    return summariseStretches(this.client, channel, { own: this.stretches, above: this.stretches });
  }

  private async one<R extends object>(text: string): Promise<R> {
    return (await this.client.query<R>(text)).rows[0] as R;
  }
}

/** UTC ms of a column of instants. */
export const msOf = (column: string): string => `(extract(epoch from ${column}) * 1000)::double precision`;
