import type { Intensities } from './intensities';

/**
 * A picture summed up along its columns, and how much noise each column carries. Noise is told from signal by fourth differences
 * (1, −4, 6, −4, 1), which a polynomial of third degree does not reach; their variance is 70 times that of a pixel with white noise.
 */
export interface Profile {
  /** Mean intensity of each column. */
  mean: Float64Array;
  /** Variance of that mean, from differences along the rows and along the columns; null where there are too few rows. */
  varianceAlongX: Float64Array;
  varianceAlongY: Float64Array | null;
}

/** Sum of the squares of 1, −4, 6, −4, 1. */
const DIFFERENCE_GAIN = 70;
/** A fourth difference needs five pixels; with few more its estimate is worth nothing. */
const FEWEST_ROWS = 9;

/** The profile over the rows `from` ≤ y < `to`. Needs at least five columns. */
export function profileOf({ width, values }: Intensities, { from, to }: { from: number; to: number }): Profile {
  const rows = to - from;
  const mean = new Float64Array(width);
  const alongX = new Float64Array(width);
  const alongY = new Float64Array(width);
  for (let y = from; y < to; y += 1) {
    const start = y * width;
    for (let x = 0; x < width; x += 1) mean[x] = (mean[x] as number) + (values[start + x] as number) / rows;
    for (let x = 2; x < width - 2; x += 1) {
      const d = difference(values, start + x, 1);
      alongX[x] = (alongX[x] as number) + d * d;
    }
    if (y < from + 2 || y >= to - 2) continue;
    for (let x = 0; x < width; x += 1) {
      const d = difference(values, start + x, width);
      alongY[x] = (alongY[x] as number) + d * d;
    }
  }
  for (const [edge, inner] of [
    [0, 2],
    [1, 2],
    [width - 1, width - 3],
    [width - 2, width - 3],
  ] as const)
    alongX[edge] = alongX[inner] as number;
  const ofMean = (sum: Float64Array, counted: number) => sum.map((s) => s / DIFFERENCE_GAIN / counted / rows);
  return {
    mean,
    varianceAlongX: ofMean(alongX, rows),
    varianceAlongY: rows < FEWEST_ROWS ? null : ofMean(alongY, rows - 4),
  };
}

const difference = (values: Float64Array, at: number, step: number): number =>
  (values[at - 2 * step] as number) -
  4 * (values[at - step] as number) +
  6 * (values[at] as number) -
  4 * (values[at + step] as number) +
  (values[at + 2 * step] as number);

/**
 * Variance of a weighted sum of the columns. A steep flank looks like noise to the differences across it, so the smaller of the two estimates is
 * the better one.
 */
export function varianceOf(profile: Profile, weights: Float64Array): number {
  const sum = (variance: Float64Array) => weights.reduce((total, w, x) => total + w * w * (variance[x] as number), 0);
  const alongX = sum(profile.varianceAlongX);
  return profile.varianceAlongY === null ? alongX : Math.min(alongX, sum(profile.varianceAlongY));
}

/** A running mean over five values, fewer at the ends. */
export function smoothed(values: ArrayLike<number>): Float64Array {
  return Float64Array.from({ length: values.length }, (_, x) => {
    const from = Math.max(0, x - 2);
    const to = Math.min(values.length, x + 3);
    let sum = 0;
    for (let i = from; i < to; i += 1) sum += values[i] as number;
    return sum / (to - from);
  });
}
