import type { SampleBatch } from '../interfaces/sample-store';
import { microsecondsOf } from './sample-copy';

/** The levels of the sample summaries and how they fill a window; pure. */

/** Width of the buckets of level 0, µs; those of each level above are 8 times as wide. The migration has the same figures. */
export const bucketUs = 2_000_000;
const widening = 8;
export const topLevel = 5;

/** Width of the buckets of a level, µs. */
export const widthUs = (level: number): number => bucketUs * widening ** level;

/** A stretch of time from `fromUs` up to `toUs`, which it does not hold, that the samples themselves (`level` null) or buckets of one level fill. */
export interface Piece {
  level: number | null;
  fromUs: number;
  toUs: number;
}

/**
 * Pieces in order of time that fill the stretch exactly: buckets of `top` in its middle, ever finer ones towards its ends, samples where not even one of
 * level 0 fits in.
 */
export function coverOf({ fromUs, toUs }: { fromUs: number; toUs: number }, top: number | null = topLevel): Piece[] {
  if (fromUs >= toUs) return [];
  if (top === null) return [{ level: null, fromUs, toUs }];
  const width = widthUs(top);
  const below = top === 0 ? null : top - 1;
  const [first, last] = [Math.ceil(fromUs / width) * width, Math.floor(toUs / width) * width];
  if (first >= last) return coverOf({ fromUs, toUs }, below);
  return [...coverOf({ fromUs, toUs: first }, below), { level: top, fromUs: first, toUs: last }, ...coverOf({ fromUs: last, toUs }, below)];
}

/** Time from `fromUs` up to `toUs`, both where buckets of level 0 begin. */
export interface Stretch {
  fromUs: number;
  toUs: number;
}

/** The same stretches in their order, those as one that overlap or lie no farther apart than `closeUs`. */
export function joinStretches(stretches: readonly Stretch[], closeUs: number): Stretch[] {
  const joined: Stretch[] = [];
  for (const { fromUs, toUs } of [...stretches].sort((a, b) => a.fromUs - b.fromUs)) {
    const last = joined.at(-1);
    if (last !== undefined && fromUs - last.toUs <= closeUs) last.toUs = Math.max(last.toUs, toUs);
    else joined.push({ fromUs, toUs });
  }
  return joined;
}

/** Stretches of buckets of level 0 in which instants lie, in order; neighbours are one stretch. */
export function stretchesOf(utcMs: Float64Array): Stretch[] {
  const numbers = new Set<number>();
  for (const at of utcMs) numbers.add(Math.floor(microsecondsOf(at) / bucketUs));
  const stretches: Stretch[] = [];
  for (const number of [...numbers].sort((a, b) => a - b)) {
    const last = stretches.at(-1);
    if (last?.toUs === number * bucketUs) last.toUs += bucketUs;
    else stretches.push({ fromUs: number * bucketUs, toUs: (number + 1) * bucketUs });
  }
  return stretches;
}

export interface Bucket {
  fromUs: number;
  count: number;
  /** In the channel's unit; of equal ones the first. */
  least: number;
  leastMs: number;
  greatest: number;
  greatestMs: number;
  mean: number;
}

/** 2⁻⁶⁰ and back, so that no sum of finite values overflows; powers of two cost no digit. */
const [down, up] = [2 ** -60, 2 ** 60];

/** What the samples of a batch come to in buckets of level 0: the same as the function of the database makes of them. */
export function bucketsOf({ utcMs, value }: SampleBatch): Bucket[] {
  const buckets = new Map<number, Bucket>();
  for (let index = 0; index < utcMs.length; index += 1) {
    const [ms, one] = [utcMs[index] as number, value[index] as number];
    const number = Math.floor(microsecondsOf(ms) / bucketUs);
    const bucket = buckets.get(number);
    if (bucket === undefined) {
      const first = { count: 1, least: one, leastMs: ms, greatest: one, greatestMs: ms, mean: one * down };
      buckets.set(number, { fromUs: number * bucketUs, ...first });
    } else add(bucket, ms, one);
  }
  for (const bucket of buckets.values()) {
    const { least, greatest, mean: sum, count } = bucket;
    bucket.mean = Math.min(greatest * down, Math.max(least * down, sum / count)) * up;
  }
  return [...buckets.values()];
}

/** Until all are there, `mean` is the sum, scaled down. */
function add(bucket: Bucket, ms: number, value: number): void {
  bucket.count += 1;
  bucket.mean += value * down;
  if (value < bucket.least || (value === bucket.least && ms < bucket.leastMs)) {
    bucket.least = value;
    bucket.leastMs = ms;
  }
  if (value > bucket.greatest || (value === bucket.greatest && ms < bucket.greatestMs)) {
    bucket.greatest = value;
    bucket.greatestMs = ms;
  }
}

/** How a window is cut for a plot: buckets of `level` in cells of `stepUs`, a whole number of them. */
export interface Cells {
  level: number;
  stepUs: number;
}

/** The coarsest level of which `cells` or fewer are not too wide for the window, and how wide the cells are. */
export function cellsOf(spanUs: number, cells: number): Cells {
  // A window that begins and ends within cells meets one more than fit into it.
  const wantedUs = spanUs / Math.max(1, cells - 2);
  let level = 0;
  while (level < topLevel && widthUs(level + 1) <= wantedUs) level += 1;
  return { level, stepUs: Math.max(1, Math.ceil(wantedUs / widthUs(level))) * widthUs(level) };
}
