import { applyQ, applyQTransposed, factorise, inverseNormal, solveR, sumOfSquares, type QrFactors } from './least-squares';
import { at, invertSymmetric, SingularMatrixError, solveSymmetric, type Matrix } from './symmetric';

/**
 * Separable nonlinear least squares by variable projection (Golub & Pereyra 1973, SIAM J. Numer. Anal. 10, 413, from
 * memory) with Kaufman's Jacobian, over segments that share the nonlinear parameters and each have linear
 * coefficients of their own: yᵢ ≈ Φᵢ(α) cᵢ.
 */

/** The basis of one segment at given parameters, with its derivatives. */
export interface Basis {
  /** Columns of Φ; owned by the fit, which overwrites them. */
  columns: Float64Array[];
  /** The columns of ∂Φ/∂α that are not zero; computed only where they are needed, and before the columns are overwritten. */
  derivatives(): BasisDerivative[];
}

export interface BasisDerivative {
  column: number;
  parameter: number;
  values: Float64Array;
}

export interface SeparableSegment {
  y: Float64Array;
  /** Root of the weight of each datum; absent: all 1. */
  rootWeight?: Float64Array;
  basis(alpha: readonly number[]): Basis;
}

export interface SegmentFit {
  coefficients: Float64Array;
  /** Data minus model, each times the root of its weight. */
  residuals: Float64Array;
  /** (ΦᵀΦ)⁻¹ */
  inverseNormal: Matrix;
  /** ∂c/∂α = −Φ⁺D, one row for each coefficient. */
  shift: Matrix;
  /** DᵀP⊥D: what this segment adds to the normal equations of α. */
  information: Matrix;
  /** (P⊥D)ᵀr: sums to zero over the segments at the optimum. */
  score: number[];
}

export interface SeparableFit {
  alpha: number[];
  /** Residual sum of squares. */
  ssr: number;
  degreesOfFreedom: number;
  /** ssr over degrees of freedom. */
  variance: number;
  /** Sum of the segments' information. */
  information: Matrix;
  /** variance · information⁻¹ */
  alphaCovariance: Matrix;
  segments: SegmentFit[];
  iterations: number;
  converged: boolean;
}

export interface SeparableOptions {
  maxIterations?: number;
  /** Largest relative change of a parameter that counts as none. */
  tolerance?: number;
  /** Keeps a step inside what makes sense; a trial outside counts as worse. */
  allowed?: (alpha: readonly number[]) => boolean;
}

interface Evaluation {
  ssr: number;
  information: Matrix;
  gradient: number[];
  segments: SegmentFit[];
}

/**
 * Least-squares fit from the start values `start`, by Levenberg–Marquardt steps in α alone.
 * @throws SingularMatrixError when the data cannot determine the parameters at the start values.
 */
export function fitSeparable(
  segments: readonly SeparableSegment[],
  start: readonly number[],
  options: SeparableOptions = {},
): SeparableFit {
  const { maxIterations = 200, tolerance = 1e-11, allowed = () => true } = options;
  let alpha = [...start];
  let best = evaluate(segments, alpha);
  let damping = 1e-3;
  let iterations = 0;
  let converged = false;
  while (!converged && iterations < maxIterations && damping < 1e16) {
    iterations += 1;
    const step = dampedStep(best, damping);
    const trialAlpha = alpha.map((value, j) => value + (step[j] as number));
    const small = step.every((value, j) => Math.abs(value) <= tolerance * Math.abs(alpha[j] as number));
    const trial = allowed(trialAlpha) ? tryEvaluate(segments, trialAlpha) : null;
    if (trial !== null && trial.ssr <= best.ssr) {
      converged = small || best.ssr - trial.ssr <= 1e-15 * best.ssr;
      alpha = trialAlpha;
      best = trial;
      damping = Math.max(damping / 10, 1e-12);
    } else {
      converged = small;
      damping = Math.max(damping, 1e-9) * 8;
    }
  }
  return summary(segments, { alpha, best, iterations, converged });
}

/** The linear coefficients at fixed parameters, with the same quantities as a fit. */
export function solveAtFixedAlpha(segments: readonly SeparableSegment[], alpha: readonly number[]): SeparableFit {
  return summary(segments, { alpha: [...alpha], best: evaluate(segments, alpha), iterations: 0, converged: true });
}

/** Residual sum of squares at fixed parameters; infinite where the columns depend on each other. */
export function residualSumAt(segments: readonly SeparableSegment[], alpha: readonly number[]): number {
  let ssr = 0;
  for (const segment of segments) {
    const projected = project(segment, segment.basis(alpha).columns);
    if (projected === null) return Infinity;
    ssr += projected.tail;
  }
  return ssr;
}

function summary(
  segments: readonly SeparableSegment[],
  found: { alpha: number[]; best: Evaluation; iterations: number; converged: boolean },
): SeparableFit {
  const { alpha, best, iterations, converged } = found;
  const data = segments.reduce((sum, { y }) => sum + y.length, 0);
  const coefficients = best.segments.reduce((sum, segment) => sum + segment.coefficients.length, 0);
  const degreesOfFreedom = data - coefficients - alpha.length;
  const variance = degreesOfFreedom > 0 ? best.ssr / degreesOfFreedom : NaN;
  const alphaCovariance = invertOrInfinite(best.information).map((row) => row.map((value) => value * variance));
  return {
    alpha,
    ssr: best.ssr,
    degreesOfFreedom,
    variance,
    information: best.information,
    alphaCovariance,
    segments: best.segments,
    iterations,
    converged,
  };
}

function invertOrInfinite(matrix: Matrix): Matrix {
  try {
    return invertSymmetric(matrix);
  } catch (error) {
    if (error instanceof SingularMatrixError) return matrix.map((row, i) => row.map((_, j) => (i === j ? Infinity : 0)));
    throw error;
  }
}

function dampedStep(current: Evaluation, damping: number): number[] {
  const damped = current.information.map((row, i) => row.map((value, j) => (i === j ? value * (1 + damping) : value)));
  return solveSymmetric(damped, current.gradient);
}

function tryEvaluate(segments: readonly SeparableSegment[], alpha: readonly number[]): Evaluation | null {
  try {
    const found = evaluate(segments, alpha);
    return Number.isFinite(found.ssr) ? found : null;
  } catch (error) {
    if (error instanceof SingularMatrixError) return null;
    throw error;
  }
}

function evaluate(segments: readonly SeparableSegment[], alpha: readonly number[]): Evaluation {
  const q = alpha.length;
  const information: Matrix = Array.from({ length: q }, () => new Array<number>(q).fill(0));
  const gradient = new Array<number>(q).fill(0);
  let ssr = 0;
  const fits = segments.map((segment) => {
    const fit = fitSegment(segment, alpha);
    ssr += sumOfSquares(fit.residuals);
    for (let i = 0; i < q; i += 1) {
      gradient[i] = (gradient[i] as number) + (fit.score[i] as number);
      for (let j = 0; j < q; j += 1) (information[i] as number[])[j] = at(information, i, j) + at(fit.information, i, j);
    }
    return fit;
  });
  return { ssr, information, gradient, segments: fits };
}

function weigh(values: Float64Array, rootWeight: Float64Array | undefined): Float64Array {
  if (rootWeight !== undefined) for (let i = 0; i < values.length; i += 1) values[i] = (values[i] as number) * (rootWeight[i] as number);
  return values;
}

/** QR of the weighted columns and Qᵀy; null where the columns depend on each other. `tail` is the residual sum of squares. */
function project(segment: SeparableSegment, columns: Float64Array[]): { qr: QrFactors; qty: Float64Array; tail: number } | null {
  for (const column of columns) weigh(column, segment.rootWeight);
  try {
    const qr = factorise(columns);
    const qty = weigh(Float64Array.from(segment.y), segment.rootWeight);
    applyQTransposed(qr, qty);
    return { qr, qty, tail: sumOfSquares(qty.subarray(columns.length)) };
  } catch (error) {
    if (error instanceof SingularMatrixError) return null;
    throw error;
  }
}

function fitSegment(segment: SeparableSegment, alpha: readonly number[]): SegmentFit {
  const basis = segment.basis(alpha);
  const { columns } = basis;
  const derivatives = basis.derivatives();
  const size = columns.length;
  const projected = project(segment, columns);
  if (projected === null) throw new SingularMatrixError('the columns of the fit depend on each other');
  const { qr, qty } = projected;
  const coefficients = solveR(qr, qty);
  const residuals = qty;
  residuals.fill(0, 0, size);
  const directions = alpha.map((_, parameter) => {
    const direction = new Float64Array(segment.y.length);
    for (const { column, values } of derivatives.filter((one) => one.parameter === parameter)) {
      const coefficient = coefficients[column] as number;
      for (let i = 0; i < direction.length; i += 1) direction[i] = (direction[i] as number) + coefficient * (values[i] as number);
    }
    applyQTransposed(qr, weigh(direction, segment.rootWeight));
    return direction;
  });
  const shiftColumns = directions.map((direction) => solveR(qr, direction));
  // In the rotated frame P⊥ merely drops the first entries, so no vector has to be rotated back.
  const tails = directions.map((direction) => direction.subarray(size));
  const information = tails.map((a) => tails.map((b) => dot(a, b)));
  const score = tails.map((tail) => dot(tail, residuals.subarray(size)));
  applyQ(qr, residuals);
  const shift = Array.from(coefficients, (_, i) => shiftColumns.map((column) => -(column[i] as number)));
  return { coefficients, residuals, inverseNormal: inverseNormal(qr), shift, information, score };
}

function dot(a: Float64Array, b: Float64Array): number {
  let sum = 0;
  for (let i = 0; i < a.length; i += 1) sum += (a[i] as number) * (b[i] as number);
  return sum;
}
