/**
 * Deviations of a series of averages over longer and longer times (NIST SP 1065, 5.2): `allan` overlapping (5.2.4); `modified` (5.2.5), which tells white
 * noise from what is nearly as fast; `hadamard` overlapping (5.2.8), blind to a straight drift; `total` (5.2.11), surer at long times, from the series
 * mirrored at its ends.
 */
export type DeviationKind = 'allan' | 'modified' | 'hadamard' | 'total';

/** Squares of the differences of one series: the squared deviation is `sum / count`, also of several series added up. */
export interface DeviationSums {
  sum: number;
  count: number;
  /** Equivalent degrees of freedom of the sum where the series is white noise: the first two moments matched. */
  freedom: number;
}

/** Of averages over m neighbours, in the unit of the values; NaN where the series is too short. */
export function deviation(values: readonly number[], m: number, kind: DeviationKind): number {
  const { sum, count } = deviationSums(values, m, kind);
  return Math.sqrt(sum / count);
}

/** At 1, 2, 4, … averages of `tauS` seconds for which at least two differences are left; u for white noise. */
export function allanDeviations(values: readonly number[], tauS: number): { tau_s: number; deviation: number; u: number }[] {
  const points: { tau_s: number; deviation: number; u: number }[] = [];
  for (let m = 1; values.length + 1 - 2 * m >= 2; m *= 2) {
    const { sum, count, freedom } = deviationSums(values, m, 'allan');
    const found = Math.sqrt(sum / count);
    points.push({ tau_s: m * tauS, deviation: found, u: found / Math.sqrt(2 * Math.max(1, freedom)) });
  }
  return points;
}

export function deviationSums(values: readonly number[], m: number, kind: DeviationKind): DeviationSums {
  if (kind === 'total') return totalSums(values, m);
  const kernel = kernelOf(m, kind);
  const count = Math.max(0, values.length - kernel.length + 1);
  return { sum: squaresOf(differences(values, m, kind)) / squaredNorm(m, kind), count, freedom: whiteFreedom(kernel, count) };
}

/** Squared deviation that white noise of variance 1 has. */
export function whiteVariance(m: number, kind: DeviationKind): number {
  const of = kind === 'total' ? 'allan' : kind;
  return kernelOf(m, of).reduce((sum, w) => sum + w * w, 0) / squaredNorm(m, of);
}

type DifferenceKind = Exclude<DeviationKind, 'total'>;

/** By what the square of a difference of sums is divided. */
const squaredNorm = (m: number, kind: DifferenceKind): number =>
  kind === 'allan' ? 2 * m ** 2 : kind === 'modified' ? 2 * m ** 4 : 6 * m ** 2;

/** What a difference takes of each of the values beneath it. */
function kernelOf(m: number, kind: DifferenceKind): number[] {
  if (kind === 'allan') return Array.from({ length: 2 * m }, (_, k) => (k < m ? -1 : 1));
  if (kind === 'hadamard') return Array.from({ length: 3 * m }, (_, k) => (k < m || k >= 2 * m ? 1 : -2));
  // m neighbouring differences, added.
  const together = (k: number) => Math.max(0, m - Math.abs(k - m + 1));
  return Array.from({ length: 3 * m - 1 }, (_, k) => together(k - m) - together(k));
}

/** All differences of sums over m neighbours. */
function differences(values: readonly number[], m: number, kind: DifferenceKind): Float64Array {
  const second = differencesOf(summed(values), m, 2);
  if (kind === 'hadamard') return differencesOf(second, m, 1);
  return kind === 'allan' ? second : differencesOf(summed(second), m, 1);
}

function summed(values: ArrayLike<number>): Float64Array {
  const sums = new Float64Array(values.length + 1);
  for (let i = 0; i < values.length; i += 1) sums[i + 1] = (sums[i] as number) + (values[i] as number);
  return sums;
}

function differencesOf(values: Float64Array, m: number, times: number): Float64Array {
  if (times === 0) return values;
  const once = Float64Array.from({ length: Math.max(0, values.length - m) }, (_, i) => (values[i + m] as number) - (values[i] as number));
  return differencesOf(once, m, times - 1);
}

const squaresOf = (values: Float64Array): number => values.reduce((sum, value) => sum + value * value, 0);

/** tr(M)²/tr(M²), with M the covariance of differences of white noise, which hangs on their distance alone. */
function whiteFreedom(kernel: readonly number[], count: number): number {
  if (count === 0) return 0;
  const overlap = (lag: number) => kernel.reduce((sum, w, k) => sum + w * (kernel[k + lag] ?? 0), 0);
  const own = overlap(0);
  let square = count * own * own;
  for (let lag = 1; lag < Math.min(count, kernel.length); lag += 1) square += 2 * (count - lag) * overlap(lag) ** 2;
  return (count * own) ** 2 / square;
}

/** Each sum of the series but its ends, between its neighbours at m; beyond the ends the series is its own mirror. */
function totalSums(values: readonly number[], m: number): DeviationSums {
  const length = values.length;
  const count = Math.max(0, length - 1);
  if (count === 0 || m > length) return { sum: 0, count: 0, freedom: 0 };
  const mirrored = [...values.slice(0, m).reverse(), ...values, ...values.slice(length - m).reverse()];
  const second = differencesOf(summed(mirrored), m, 2).subarray(1, length);
  // Degrees of freedom with white noise: 1.5 of each length (from memory, after Howe 2000); no more than those of all differences.
  return { sum: squaresOf(second) / (2 * m * m), count, freedom: Math.min(count, (1.5 * length) / m) };
}
