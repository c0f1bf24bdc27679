import { SingularMatrixError, type Matrix } from './symmetric';

/** Linear least squares by Householder reflections: stable where normal equations lose half the digits. */
export interface QrFactors {
  rows: number;
  /** Reflectors below the diagonal, R above it; one array for each column. */
  columns: Float64Array[];
  /** Diagonal of R. */
  diagonal: Float64Array;
}

/** Columns whose part that is new, relative to their length, is smaller than this count as dependent. */
const dependenceLimit = 1e-13;

/**
 * Factorises a matrix given by its columns, which are overwritten.
 * @throws SingularMatrixError when a column depends on those before it.
 */
export function factorise(columns: Float64Array[]): QrFactors {
  const rows = columns[0]?.length ?? 0;
  const diagonal = new Float64Array(columns.length);
  if (rows < columns.length) throw new SingularMatrixError(`${columns.length} coefficients need more than ${rows} data`);
  for (let k = 0; k < columns.length; k += 1) {
    const column = columns[k] as Float64Array;
    const length = norm(column, 0);
    const rest = norm(column, k);
    if (!(rest > dependenceLimit * length)) throw new SingularMatrixError('the columns of the fit depend on each other');
    const head = column[k] as number;
    const signed = head > 0 ? -rest : rest;
    diagonal[k] = signed;
    // v = x − αe₁, kept scaled so that vᵀv/2 = 1 up to the sign: H = I − v vᵀ / (rest·(rest + |head|)).
    column[k] = head - signed;
    const scale = 1 / Math.sqrt(rest * (rest + Math.abs(head)));
    for (let i = k; i < rows; i += 1) column[i] = (column[i] as number) * scale;
    for (let j = k + 1; j < columns.length; j += 1) reflect(column, k, columns[j] as Float64Array);
  }
  return { rows, columns, diagonal };
}

function norm(column: Float64Array, from: number): number {
  let sum = 0;
  for (let i = from; i < column.length; i += 1) sum += (column[i] as number) * (column[i] as number);
  return Math.sqrt(sum);
}

function reflect(v: Float64Array, from: number, target: Float64Array): void {
  let dot = 0;
  for (let i = from; i < v.length; i += 1) dot += (v[i] as number) * (target[i] as number);
  for (let i = from; i < v.length; i += 1) target[i] = (target[i] as number) - dot * (v[i] as number);
}

/** Qᵀy, in place. */
export function applyQTransposed(qr: QrFactors, y: Float64Array): void {
  for (let k = 0; k < qr.columns.length; k += 1) reflect(qr.columns[k] as Float64Array, k, y);
}

/** Q y, in place. */
export function applyQ(qr: QrFactors, y: Float64Array): void {
  for (let k = qr.columns.length - 1; k >= 0; k -= 1) reflect(qr.columns[k] as Float64Array, k, y);
}

/** Solves R c = the first entries of `qty`. */
export function solveR(qr: QrFactors, qty: ArrayLike<number>): Float64Array {
  const size = qr.columns.length;
  const c = new Float64Array(size);
  for (let i = size - 1; i >= 0; i -= 1) {
    let sum = qty[i] as number;
    for (let j = i + 1; j < size; j += 1) sum -= ((qr.columns[j] as Float64Array)[i] as number) * (c[j] as number);
    c[i] = sum / (qr.diagonal[i] as number);
  }
  return c;
}

/** (ΦᵀΦ)⁻¹ = R⁻¹R⁻ᵀ: the covariance of the coefficients for unit variance of the data. */
export function inverseNormal(qr: QrFactors): Matrix {
  const size = qr.columns.length;
  const inverse = Array.from({ length: size }, (_, j) =>
    solveR(
      qr,
      Float64Array.from({ length: size }, (__, i) => (i === j ? 1 : 0)),
    ),
  );
  return Array.from({ length: size }, (_, i) =>
    Array.from({ length: size }, (__, j) => inverse.reduce((sum, column) => sum + (column[i] as number) * (column[j] as number), 0)),
  );
}

export interface LinearFit {
  coefficients: Float64Array;
  residuals: Float64Array;
  /** Residual sum of squares. */
  ssr: number;
  /** Covariance of the coefficients for unit variance of the data. */
  unitCovariance: Matrix;
}

/** Ordinary least squares of `y` on columns (copied, not changed). @throws SingularMatrixError */
export function leastSquares(columns: readonly ArrayLike<number>[], y: ArrayLike<number>): LinearFit {
  const qr = factorise(columns.map((column) => Float64Array.from(column)));
  const work = Float64Array.from(y);
  applyQTransposed(qr, work);
  const coefficients = solveR(qr, work);
  work.fill(0, 0, columns.length);
  applyQ(qr, work);
  return { coefficients, residuals: work, ssr: sumOfSquares(work), unitCovariance: inverseNormal(qr) };
}

export function sumOfSquares(values: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < values.length; i += 1) sum += (values[i] as number) * (values[i] as number);
  return sum;
}
