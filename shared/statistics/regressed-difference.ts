import { abaWindows, isAlternating, legendreColumns, type SidedValue } from './drift';
import { leastSquares } from './least-squares';
import { at, SingularMatrixError, type Matrix } from './symmetric';

/** A near-minus-far difference with, beside the drift, what goes with another quantity: y = drift(t) + side · η + β x + noise. */
export interface RegressedDifference {
  difference: LinearEstimate;
  /** β, in the unit of the values per unit of x; null where no x was given. */
  coefficient: LinearEstimate | null;
  degreesOfFreedom: number;
}

/** value = Σ weight · y, u from the scatter that the model leaves. */
export interface LinearEstimate {
  value: number;
  u: number;
  weights: number[];
}

/** Fewer degrees of freedom than these tell no scatter that a coefficient could be judged by. */
const leastFreedom = 3;

/**
 * The difference of an alternating series by least squares over its ABA windows, of another one, or where a polynomial is asked for, over
 * the values with a polynomial in time; x joins as one more column, seen through the same windows. The windows overlap: the uncertainties
 * come from the covariance that this gives them. Without x the value is that of `abaDifference` or `polynomialDifference`.
 * @param x one for each value, or null
 * @returns null where the series is too short, has one side only, or x does not change otherwise than side and drift do
 */
export function regressedDifference(
  series: readonly SidedValue[],
  x: readonly number[] | null,
  drift: { kind: 'aba' | 'polynomial' | 'gls'; order: number },
): RegressedDifference | null {
  const byWindows = drift.kind !== 'polynomial' && isAlternating(series);
  const rows = byWindows ? abaWindows(series).map(({ weights }, from) => ({ from, weights: [...weights] })) : plainRows(series.length);
  const seen = (values: readonly number[]) =>
    rows.map(({ from, weights }) => weights.reduce((sum, w, i) => sum + w * (values[from + i] as number), 0));
  const times = series.map(({ timeS }) => timeS);
  const fixed = byWindows ? [rows.map(() => 0.5)] : [series.map(({ side }) => side / 2), ...legendreColumns(times, drift.order)];
  const columns = x === null ? fixed : [...fixed, seen(centred(x))];
  if (rows.length < columns.length + 1) return null;
  try {
    return estimated({ rows, columns, values: series.map(({ value }) => value), seen, regressor: x === null ? null : fixed.length });
  } catch (error) {
    if (error instanceof SingularMatrixError) return null;
    throw error;
  }
}

interface Row {
  from: number;
  weights: readonly number[];
}

interface Model {
  rows: readonly Row[];
  columns: readonly number[][];
  values: readonly number[];
  seen: (values: readonly number[]) => number[];
  /** Column of x; null without. */
  regressor: number | null;
}

function estimated({ rows, columns, values, seen, regressor }: Model): RegressedDifference | null {
  const fit = leastSquares(columns, seen(values));
  const loads = columns.map((_, j) =>
    rows.map((__, k) => columns.reduce((sum, column, l) => sum + at(fit.unitCovariance, j, l) * (column[k] as number), 0)),
  );
  const scatter = scatterOf(rows, columns, fit.unitCovariance);
  if (scatter.degreesOfFreedom < leastFreedom) return null;
  const sigma = Math.sqrt(fit.ssr / scatter.expected);
  const estimate = (j: number): LinearEstimate => {
    const weights = values.map(() => 0);
    rows.forEach(({ from, weights: own }, k) =>
      own.forEach((w, i) => (weights[from + i] = (weights[from + i] as number) + ((loads[j] as number[])[k] as number) * w)),
    );
    return { value: fit.coefficients[j] as number, u: sigma * Math.hypot(...weights), weights };
  };
  return {
    difference: estimate(0),
    coefficient: regressor === null ? null : estimate(regressor),
    degreesOfFreedom: scatter.degreesOfFreedom,
  };
}

/**
 * The residual sum of squares is a quadratic form in the values: with M the covariance of the rows for unit variance of a value and C the
 * projection beside the columns its expectation is tr(C M), and tr(C M)² / tr((C M)²) the degrees of freedom that match its spread.
 */
function scatterOf(rows: readonly Row[], columns: readonly number[][], unitCovariance: Matrix) {
  const overlap = (k: number, l: number) => {
    const [a, b] = [rows[k] as Row, rows[l] as Row];
    return a.weights.reduce((sum, w, i) => sum + w * (b.weights[a.from + i - b.from] ?? 0), 0);
  };
  const reach = 2;
  const applied = (column: readonly number[]) =>
    rows.map((_, k) => {
      let sum = 0;
      for (let l = Math.max(0, k - reach); l <= Math.min(rows.length - 1, k + reach); l += 1) sum += overlap(k, l) * (column[l] as number);
      return sum;
    });
  const once = columns.map(applied);
  const inner = (a: readonly (readonly number[])[], b: readonly (readonly number[])[]) =>
    a.map((one) => b.map((other) => one.reduce((sum, value, k) => sum + value * (other[k] as number), 0)));
  const [first, second] = [inner(columns, once), inner(once, once)];
  let [trace, square] = [0, 0];
  rows.forEach((_, k) => {
    trace += overlap(k, k);
    for (let l = Math.max(0, k - reach); l <= Math.min(rows.length - 1, k + reach); l += 1) square += overlap(k, l) ** 2;
  });
  const share = product(unitCovariance, first);
  const expected = trace - traceOf(share);
  const spread = square - 2 * traceOf(product(unitCovariance, second)) + traceOf(product(share, share));
  return { expected, degreesOfFreedom: expected ** 2 / spread };
}

const product = (a: Matrix, b: Matrix): Matrix =>
  a.map((row) => (b[0] as number[]).map((_, j) => row.reduce((sum, value, k) => sum + value * at(b, k, j), 0)));
const traceOf = (a: Matrix) => a.reduce((sum, _, i) => sum + at(a, i, i), 0);
const plainRows = (count: number): Row[] => Array.from({ length: count }, (_, from) => ({ from, weights: [1] }));
function centred(values: readonly number[]): number[] {
  const mean = values.reduce((sum, value) => sum + value, 0) / values.length;
  return values.map((value) => value - mean);
}
