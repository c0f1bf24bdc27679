/** Small dense symmetric systems, row by row. */
export type Matrix = number[][];

export class SingularMatrixError extends Error {}

/** Lower triangle L with L Lᵀ = A. @throws SingularMatrixError when A is not positive definite. */
export function cholesky(a: Matrix): Matrix {
  const n = a.length;
  const l: Matrix = Array.from({ length: n }, () => new Array<number>(n).fill(0));
  for (let i = 0; i < n; i += 1) {
    for (let j = 0; j <= i; j += 1) {
      let sum = at(a, i, j);
      for (let k = 0; k < j; k += 1) sum -= at(l, i, k) * at(l, j, k);
      if (i === j && !(sum > 0))
        throw new SingularMatrixError('the normal equations are singular: the data do not determine all parameters');
      (l[i] as number[])[j] = i === j ? Math.sqrt(sum) : sum / at(l, j, j);
    }
  }
  return l;
}

export const at = (matrix: Matrix, row: number, column: number) => (matrix[row] as number[])[column] as number;

/** Solution of A x = b for a positive definite A; A is scaled to a unit diagonal first, so units do not matter. */
export function solveSymmetric(a: Matrix, b: readonly number[]): number[] {
  const scale = a.map((row, i) => Math.sqrt(row[i] as number));
  if (scale.some((s) => !(s > 0))) throw new SingularMatrixError('a parameter has no influence on the data');
  const l = cholesky(a.map((row, i) => row.map((value, j) => value / ((scale[i] as number) * (scale[j] as number)))));
  const x = b.map((value, i) => value / (scale[i] as number));
  for (let i = 0; i < x.length; i += 1) {
    for (let k = 0; k < i; k += 1) x[i] = (x[i] as number) - at(l, i, k) * (x[k] as number);
    x[i] = (x[i] as number) / at(l, i, i);
  }
  for (let i = x.length - 1; i >= 0; i -= 1) {
    for (let k = i + 1; k < x.length; k += 1) x[i] = (x[i] as number) - at(l, k, i) * (x[k] as number);
    x[i] = (x[i] as number) / at(l, i, i);
  }
  return x.map((value, i) => value / (scale[i] as number));
}

/** Inverse of a positive definite matrix. @throws SingularMatrixError */
export function invertSymmetric(a: Matrix): Matrix {
  const columns = a.map((_, j) =>
    solveSymmetric(
      a,
      a.map((__, i) => (i === j ? 1 : 0)),
    ),
  );
  return a.map((_, i) => a.map((__, j) => (at(columns, i, j) + at(columns, j, i)) / 2));
}

/** vᵀ A w */
export function bilinear(v: readonly number[], a: Matrix, w: readonly number[]): number {
  let sum = 0;
  v.forEach((vi, i) => w.forEach((wj, j) => (sum += vi * at(a, i, j) * wj)));
  return sum;
}
