import { leastSquares } from './least-squares';
import { SingularMatrixError, at } from './symmetric';

/** The near-minus-far difference of a series of dwells whose zero drifts: y = drift(t) + side · η + noise, difference 2η. */
export interface SidedValue {
  /** Time of the value (middle of the dwell), s. */
  timeS: number;
  /** +1 near, −1 far. */
  side: 1 | -1;
  value: number;
  /** Time that the value is a mean over, s; 0 where nobody says. */
  lengthS?: number;
}

export interface DifferenceEstimate {
  /** Near minus far, in full, in the unit of the values. */
  value: number;
  /** value = Σ weight · y */
  weights: number[];
  /** Standard uncertainty from the scatter that drift and difference leave; null when nothing is left to judge by. */
  u: number | null;
  /** Degrees of freedom of `u`; null with it. */
  degreesOfFreedom: number | null;
}

/** Adjacent values on opposite sides. */
export function countReversals(series: readonly SidedValue[]): number {
  return series.slice(1).filter((one, k) => one.side !== (series[k] as SidedValue).side).length;
}

export function isAlternating(series: readonly SidedValue[]): boolean {
  return countReversals(series) === series.length - 1;
}

/**
 * Mean of all ABA windows: each value against the line through its two neighbours, so a drift that is straight over
 * three dwells cancels, also at unequal times. The uncertainty is judged from the scatter of the windows, which sees the
 * drift that the windows let through and not the slow one that they remove; its degrees of freedom by matching the first two moments.
 * @throws Error when the series has less than three values or does not alternate.
 */
export function abaDifference(series: readonly SidedValue[]): DifferenceEstimate {
  if (series.length < 3 || !isAlternating(series)) throw new Error('ABA windows need an alternating series of at least three');
  const windows = abaWindows(series);
  const count = windows.length;
  const weights = new Array<number>(series.length).fill(0);
  windows.forEach(({ weights: three }, k) => three.forEach((w, i) => (weights[k + i] = (weights[k + i] as number) + (2 * w) / count)));
  const value = dot(
    weights,
    series.map((one) => one.value),
  );
  const scatter = windowScatter(windows);
  if (scatter === null) return { value, weights, u: null, degreesOfFreedom: null };
  return { value, weights, u: Math.sqrt(scatter.variance * dot(weights, weights)), degreesOfFreedom: scatter.degreesOfFreedom };
}

interface Window {
  eta: number;
  weights: [number, number, number];
}

/** Half the difference as each value and its two neighbours give it; `weights` are those of the three. */
export const abaWindows = (series: readonly SidedValue[]): Window[] => series.slice(2).map((_, k) => abaWindow(series, k));

function abaWindow(series: readonly SidedValue[], k: number): Window {
  const [a, b, c] = [series[k], series[k + 1], series[k + 2]] as [SidedValue, SidedValue, SidedValue];
  const late = (b.timeS - a.timeS) / (c.timeS - a.timeS);
  const half = a.side / 2;
  const weights: Window['weights'] = [half * (1 - late), -half, half * late];
  return { eta: weights[0] * a.value + weights[1] * b.value + weights[2] * c.value, weights };
}

/**
 * Variance of one value, judged from Σ(η_k − η̄)², which is a quadratic form in the values: its expectation for unit variance is
 * tr(C M) and its spread gives the degrees of freedom tr(C M)² / tr((C M)²), with M the covariance of the windows and C the centring.
 */
function windowScatter(windows: readonly Window[]): { variance: number; degreesOfFreedom: number } | null {
  const count = windows.length;
  if (count < 2) return null;
  const overlap = (k: number, l: number) => {
    const [a, b] = [windows[k], windows[l]];
    if (a === undefined || b === undefined) return 0;
    const shift = l - k;
    return a.weights.reduce((sum, w, i) => sum + w * (b.weights[i - shift] ?? 0), 0);
  };
  let trace = 0;
  let traceOfSquare = 0;
  let sumOfAll = 0;
  let sumOfSquaredRows = 0;
  for (let k = 0; k < count; k += 1) {
    const row = [-2, -1, 0, 1, 2].map((shift) => overlap(k, k + shift));
    const rowSum = row.reduce((a, b) => a + b, 0);
    trace += row[2] as number;
    traceOfSquare += dot(row, row);
    sumOfAll += rowSum;
    sumOfSquaredRows += rowSum * rowSum;
  }
  const expected = trace - sumOfAll / count;
  const spread = traceOfSquare - (2 * sumOfSquaredRows) / count + (sumOfAll / count) ** 2;
  const mean = windows.reduce((sum, { eta }) => sum + eta, 0) / count;
  const squares = windows.reduce((sum, { eta }) => sum + (eta - mean) ** 2, 0);
  return { variance: squares / expected, degreesOfFreedom: (expected * expected) / spread };
}

/**
 * Least squares on the side and a polynomial in time of the given order (Legendre columns, actual times). A series too
 * short for the order is fitted with the greatest order that it determines.
 * @throws Error when no order will do, that is when one side is missing.
 */
export function polynomialDifference(series: readonly SidedValue[], order: number): DifferenceEstimate & { order: number } {
  const values = series.map((one) => one.value);
  for (let degree = Math.min(order, series.length - 2); degree >= 0; degree -= 1) {
    const columns = [
      series.map((one) => one.side),
      ...legendreColumns(
        series.map((one) => one.timeS),
        degree,
      ),
    ];
    try {
      const fit = leastSquares(columns, values);
      const weights = series.map(
        (_, i) => 2 * columns.reduce((sum, column, j) => sum + at(fit.unitCovariance, 0, j) * (column[i] as number), 0),
      );
      const degreesOfFreedom = series.length - columns.length;
      const value = 2 * (fit.coefficients[0] as number);
      if (degreesOfFreedom < 1) return { value, weights, u: null, degreesOfFreedom: null, order: degree };
      return { value, weights, u: Math.sqrt((fit.ssr / degreesOfFreedom) * dot(weights, weights)), degreesOfFreedom, order: degree };
    } catch (error) {
      if (!(error instanceof SingularMatrixError)) throw error;
    }
  }
  throw new Error('a difference needs values on both sides');
}

/** Legendre polynomials of 0 to `order` over the span of the times. */
export function legendreColumns(times: readonly number[], order: number): number[][] {
  const first = Math.min(...times);
  const span = Math.max(...times) - first;
  const x = times.map((t) => (span > 0 ? (2 * (t - first)) / span - 1 : 0));
  const columns = [x.map(() => 1), [...x]];
  for (let n = 1; n < order; n += 1) {
    const [before, last] = [columns[n - 1] as number[], columns[n] as number[]];
    columns.push(x.map((xi, i) => ((2 * n + 1) * xi * (last[i] as number) - n * (before[i] as number)) / (n + 1)));
  }
  return columns.slice(0, order + 1);
}

function dot(a: readonly number[], b: readonly number[]): number {
  return a.reduce((sum, value, i) => sum + value * (b[i] as number), 0);
}
