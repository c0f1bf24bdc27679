import type { SidedValue } from './drift';

/**
 * How far a weighted sum of dwells is uncertain when the zero drifts steadily and walks at random beside the noise that each dwell has of its own. A dwell's value is
 * the mean of the walk over it: its variance is that at mid-dwell less a sixth of the dwell's length. Differences of neighbours then have a
 * covariance with one line beside the diagonal, so everything takes as many steps as there are dwells.
 */

/** Variance of the walk over the mean interval over that of a dwell's own noise, tried on a grid of half octaves. */
export const walkRatios = [0, ...Array.from({ length: 41 }, (_, k) => 2 ** (k / 2 - 10))];

/** From so many dwells on they tell walk and noise apart; with fewer the walk is guessed too often where there is none. */
export const enoughForWalk = 24;

export interface WalkScatter {
  u: number;
  degreesOfFreedom: number;
}

/**
 * u of Σ weight · value for weights that add up to nothing, the share of the walk being that of the greatest restricted likelihood.
 * Null with fewer than `enoughForWalk` dwells, or where the values do not scatter at all.
 */
export function walkScatter(series: readonly SidedValue[], weights: readonly number[]): WalkScatter | null {
  if (series.length < enoughForWalk) return null;
  const steps = stepsOf(series);
  const fits = walkRatios.map((ratio) => fitOf(steps, ratio));
  const best = fits.reduce((a, b) => (b.criterion < a.criterion ? b : a));
  if (!Number.isFinite(best.criterion)) return null;
  const shares = sharesOf(weights);
  const { diagonal, beside } = best.covariance;
  const spread = shares.reduce((sum, share, k) => sum + share * (share * at(diagonal, k) + 2 * (shares[k + 1] ?? 0) * (beside[k] ?? 0)), 0);
  return { u: Math.sqrt(best.variance * spread), degreesOfFreedom: series.length - 4 };
}

/** From each dwell to the next. */
interface Steps {
  change: number[];
  /** Of the sides. */
  turn: number[];
  /** Between mid-dwells, and a sixth of the length of the dwell that each leads to and of all dwells, in mean intervals. */
  interval: number[];
  sixth: number[];
}

function stepsOf(series: readonly SidedValue[]): Steps {
  const [first, last] = [series[0] as SidedValue, series.at(-1) as SidedValue];
  const meanS = (last.timeS - first.timeS) / (series.length - 1) || 1;
  const next = series.slice(1);
  return {
    change: next.map(({ value }, k) => value - (series[k] as SidedValue).value),
    turn: next.map(({ side }, k) => side - (series[k] as SidedValue).side),
    interval: next.map(({ timeS }, k) => (timeS - (series[k] as SidedValue).timeS) / meanS),
    sixth: series.map(({ lengthS = 0 }) => lengthS / 6 / meanS),
  };
}

interface Tridiagonal {
  diagonal: number[];
  /** Of neighbour k and k + 1. */
  beside: number[];
}

interface Fit {
  covariance: Tridiagonal;
  /** Of a dwell's own noise. */
  variance: number;
  /** −2 times the restricted log-likelihood but for a constant. */
  criterion: number;
}

/** The difference of the sides and the steady drift by generalised least squares from the steps, with the walk's share given. */
function fitOf({ change, turn, interval, sixth }: Steps, ratio: number): Fit {
  const covariance: Tridiagonal = {
    diagonal: interval.map((of, k) => 2 + ratio * (of - at(sixth, k) - at(sixth, k + 1))),
    beside: interval.slice(1).map((_, k) => ratio * at(sixth, k + 1) - 1),
  };
  const { logDeterminant, product } = whitened(covariance, [turn, interval, change]);
  const [turns, drifts, both] = [product(0, 0), product(1, 1), product(0, 1)];
  const determinant = turns * drifts - both * both;
  const [ofTurn, ofDrift] = [product(0, 2), product(1, 2)];
  const explained = (drifts * ofTurn ** 2 - 2 * both * ofTurn * ofDrift + turns * ofDrift ** 2) / determinant;
  const squares = product(2, 2) - explained;
  const freedom = change.length - 2;
  return { covariance, variance: squares / freedom, criterion: freedom * Math.log(squares) + logDeterminant + Math.log(determinant) };
}

/** Products of columns over the inverse of a covariance, by elimination without its square root. */
function whitened({ diagonal, beside }: Tridiagonal, columns: readonly (readonly number[])[]) {
  const sums = columns.map(() => columns.map(() => 0));
  let [logDeterminant, pivot] = [0, NaN];
  let left = columns.map(() => 0);
  diagonal.forEach((own, k) => {
    const factor = k === 0 ? 0 : at(beside, k - 1) / pivot;
    pivot = k === 0 ? own : own - factor * at(beside, k - 1);
    left = left.map((last, column) => at(columns[column] as number[], k) - factor * last);
    logDeterminant += Math.log(pivot);
    for (const [row, sum] of sums.entries())
      for (const column of sum.keys()) sum[column] = at(sum, column) + (at(left, row) * at(left, column)) / pivot;
  });
  return { logDeterminant, product: (row: number, column: number) => at(sums[row] as number[], column) };
}

/** Σ weight · value as Σ share · step. */
function sharesOf(weights: readonly number[]): number[] {
  let sum = 0;
  return weights.slice(0, -1).map((weight) => {
    sum -= weight;
    return sum;
  });
}

const at = (values: readonly number[], k: number) => values[k] as number;
