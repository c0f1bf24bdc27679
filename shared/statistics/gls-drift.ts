import type { DifferenceEstimate, SidedValue } from './drift';
import { leastSquares } from './least-squares';
import { at, cholesky, SingularMatrixError, type Matrix } from './symmetric';
import { walkRatios } from './wandering-zero';

/**
 * Near minus far by generalised least squares: the zero drifts steadily and walks at random between the dwells, each of which has white noise of its
 * own. The share of the walk is that of the greatest restricted likelihood.
 */

/** With fewer dwells nothing would be left beside difference, zero and drift: the zero is taken to walk only. */
const enoughForDrift = 4;

/** @throws Error when one side is missing. */
export function walkDifference(series: readonly SidedValue[]): DifferenceEstimate {
  if (new Set(series.map(({ side }) => side)).size < 2) throw new Error('a difference needs values on both sides');
  const steady = series.length >= enoughForDrift;
  const fits = walkRatios.map((ratio) => walkFit(series, ratio, steady));
  const best = fits.reduce((a, b) => (b.criterion < a.criterion ? b : a));
  const { estimate } = best;
  const degreesOfFreedom = series.length - (steady ? 4 : 3);
  return degreesOfFreedom < 1 ? { ...estimate, u: null, degreesOfFreedom: null } : { ...estimate, degreesOfFreedom };
}

interface WalkFit {
  estimate: DifferenceEstimate;
  /** −2 times the restricted log-likelihood. */
  criterion: number;
  /** Variance of the difference for unit variance of a dwell. */
  unitVariance: number;
}

/** With the walk's variance per mean interval given, in that of a dwell; `steady`: a steady drift is taken off too. */
export function walkFit(series: readonly SidedValue[], ratio: number, steady = false): WalkFit {
  const lower = cholesky(covarianceOf(series, ratio));
  const times = steady ? [timesOf(series)] : [];
  const columns = [series.map(({ side }) => side), series.map(() => 1), ...times].map((column) => forward(lower, column));
  const fit = leastSquares(
    columns,
    forward(
      lower,
      series.map(({ value }) => value),
    ),
  );
  const degreesOfFreedom = series.length - columns.length;
  const variance = degreesOfFreedom > 0 ? fit.ssr / degreesOfFreedom : NaN;
  const weights = backward(
    lower,
    columns,
    columns.map((_, j) => 2 * at(fit.unitCovariance, 0, j)),
  );
  const unitVariance = 4 * at(fit.unitCovariance, 0, 0);
  const logDeterminant = 2 * sumOfLogs(lower);
  return {
    estimate: { value: 2 * (fit.coefficients[0] as number), weights, u: Math.sqrt(variance * unitVariance), degreesOfFreedom },
    criterion:
      degreesOfFreedom > 0
        ? degreesOfFreedom * Math.log(fit.ssr + Number.MIN_VALUE) + logDeterminant - logDeterminantOf(fit.unitCovariance)
        : ratio,
    unitVariance,
  };
}

const sumOfLogs = (lower: Matrix) => lower.reduce((sum, row, i) => sum + Math.log(row[i] as number), 0);
const logDeterminantOf = (matrix: Matrix) => 2 * sumOfLogs(cholesky(matrix));

/** Of the mid-dwells, from −1 to 1. */
function timesOf(series: readonly SidedValue[]): number[] {
  const [first, last] = [series[0]?.timeS ?? 0, series.at(-1)?.timeS ?? 0];
  return series.map(({ timeS }) => (2 * timeS - first - last) / (last - first || 1));
}

function covarianceOf(series: readonly SidedValue[], ratio: number): Matrix {
  const [first, last] = [series[0]?.timeS ?? 0, series.at(-1)?.timeS ?? 0];
  const intervalS = (last - first) / Math.max(1, series.length - 1) || 1;
  // Since the first dwell began, or longer ago: the constant takes up whatever the walk did before.
  const since = series.map(({ timeS }) => (timeS - first + (series[0]?.lengthS ?? 0)) / intervalS);
  // The walk's mean over a dwell varies less than the walk at its middle, by a sixth of its length.
  const own = series.map(({ lengthS = 0 }) => 1 - (ratio * lengthS) / 6 / intervalS);
  return since.map((a, i) => since.map((b, j) => (i === j ? (own[i] as number) : 0) + ratio * Math.min(a, b)));
}

/** L⁻¹ y */
function forward(lower: Matrix, y: readonly number[]): number[] {
  const x: number[] = [];
  lower.forEach((row, i) => {
    let sum = y[i] as number;
    for (let k = 0; k < i; k += 1) sum -= (row[k] as number) * (x[k] as number);
    if (!Number.isFinite(sum)) throw new SingularMatrixError('the dwells have no finite values');
    x.push(sum / (row[i] as number));
  });
  return x;
}

/** Weights of the values: L⁻ᵀ times the whitened columns in the given shares. */
function backward(lower: Matrix, columns: readonly number[][], shares: readonly number[]): number[] {
  const x = lower.map((_, i) => columns.reduce((sum, column, j) => sum + (shares[j] as number) * (column[i] as number), 0));
  for (let i = x.length - 1; i >= 0; i -= 1) {
    for (let k = i + 1; k < x.length; k += 1) x[i] = (x[i] as number) - at(lower, k, i) * (x[k] as number);
    x[i] = (x[i] as number) / at(lower, i, i);
  }
  return x;
}
