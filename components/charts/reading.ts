import { gapOf, lowerBound, valueAt, type Series } from './curve';

/** What a series says at an instant. Pure. */

export type Reading =
  /** `u`: the scatter of single readings about there, k = 1; null where too few stand close by. */
  | { kind: 'value'; value: number; u: number | null }
  /** Of a series that is thinned to least and greatest: what lies on both sides of the instant. */
  | { kind: 'range'; least: number; greatest: number };

export interface ReadingOptions {
  /** Only least and greatest of each interval are in the series. */
  thinned: boolean;
  gapMs?: number | undefined;
}

/** Readings on each side of the instant that tell the scatter. */
const neighbours = 10;
/** Fewer third differences say too little. */
const leastDifferences = 5;

/** The reading at `x`; null outside the series and in its gaps. */
export function readingAt(series: Series, x: number, { thinned, gapMs = gapOf(series.x) }: ReadingOptions): Reading | null {
  const value = valueAt(series, x, gapMs);
  if (value === null || !Number.isFinite(value)) return null;
  const after = lowerBound(series.x, x);
  if (!thinned) return { kind: 'value', value, u: scatterAbout(series, after, gapMs) };
  const about = Array.from({ length: 4 }, (_, k) => series.y[after - 2 + k]).filter((y) => y !== undefined && Number.isFinite(y));
  return { kind: 'range', least: Math.min(...(about as number[])), greatest: Math.max(...(about as number[])) };
}

/**
 * Standard deviation of a single reading, in the unit of y: the root mean square of third differences over √20, which leaves out any parabola
 * that the readings follow (differences of order n of independent readings have the variance C(2n, n) σ²; C(6, 3) = 20).
 */
function scatterAbout({ x, y }: Series, after: number, gapMs: number): number | null {
  let sum = 0;
  let count = 0;
  for (let i = Math.max(3, after - neighbours); i < Math.min(x.length, after + neighbours); i += 1) {
    const near = [0, 1, 2].every((k) => (x[i - k] as number) - (x[i - k - 1] as number) <= gapMs);
    const third = (y[i] as number) - 3 * (y[i - 1] as number) + 3 * (y[i - 2] as number) - (y[i - 3] as number);
    if (!near || !Number.isFinite(third)) continue;
    sum += third * third;
    count += 1;
  }
  return count < leastDifferences || sum === 0 ? null : Math.sqrt(sum / count / 20);
}
