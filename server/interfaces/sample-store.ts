/** Where samples go and come from. Batches are idempotent: a sample of the same channel and instant is stored once. */
export interface SampleStore {
  append(labId: string, channelId: string, batch: SampleBatch): Promise<{ stored: number; known: number }>;
  read(labId: string, channelId: string, window: { fromUtcMs: number; toUtcMs: number }): Promise<SampleBatch>;
  /** The same in order of time, a page at a time: no more than one is in memory, and nothing is held in between. */
  pages(labId: string, channelId: string, window: { fromUtcMs: number; toUtcMs: number }): AsyncGenerator<SampleBatch>;
}

/** Mid-exposure instants (UTC ms, microsecond resolution) and values in the channel's unit; equal lengths. */
export interface SampleBatch {
  utcMs: Float64Array;
  value: Float64Array;
}

/** Samples of a file with the line on which each stands, from 1. */
export interface RowBatch extends SampleBatch {
  row: Float64Array;
}
