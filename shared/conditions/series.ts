/** Samples of a stretch of time as they lie in a channel. */
export interface Series {
  unit: string;
  /** Samples a second that are to be expected; null where nothing is. */
  rateHz: number | null;
  /** Ascending. */
  utcMs: Float64Array;
  value: Float64Array;
}

/** One condition as it stands: what was found, against what limit. */
export interface Reading {
  /** What is looked at, in words: `drift`, `box temperature`. */
  name: string;
  /** In `unit`; null where the samples do not tell. */
  value: number | null;
  limit: number;
  /** `below`: the value has to be less than the limit; `above`: more. */
  wanted: 'below' | 'above';
  unit: string;
  met: boolean;
}

/** Longest time without a sample within a window, s, its beginning and end included. */
export function longestSilenceS({ utcMs }: Pick<Series, 'utcMs'>, window: { fromUtcMs: number; toUtcMs: number }): number {
  let before = window.fromUtcMs;
  let longest = 0;
  for (const at of utcMs) {
    longest = Math.max(longest, at - before);
    before = at;
  }
  return Math.max(longest, window.toUtcMs - before) / 1000;
}

/** Slope of the straight line through the samples by least squares, in the channel's unit per hour; null for fewer than two instants. */
export function slopePerHour({ utcMs, value }: Pick<Series, 'utcMs' | 'value'>): number | null {
  const count = utcMs.length;
  if (count < 2) return null;
  const [t0, v0] = [utcMs[0] as number, value[0] as number];
  let [sumT, sumV, sumTt, sumTv] = [0, 0, 0, 0];
  for (let index = 0; index < count; index += 1) {
    const t = ((utcMs[index] as number) - t0) / 3_600_000;
    const v = (value[index] as number) - v0;
    sumT += t;
    sumV += v;
    sumTt += t * t;
    sumTv += t * v;
  }
  const spread = sumTt - (sumT * sumT) / count;
  return spread > 0 ? (sumTv - (sumT * sumV) / count) / spread : null;
}
