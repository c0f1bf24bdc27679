import { applyQTransposed, factorise, inverseNormal, solveR } from './least-squares';
import { SingularMatrixError } from './symmetric';

/** A model y = f(x, b) of any kind; x may be a number or several. */
export type Model<X> = (x: X, parameters: readonly number[]) => number;

export interface NonlinearData<X> {
  x: readonly X[];
  y: readonly number[];
}

export interface NonlinearFit {
  parameters: number[];
  /** √(variance · diagonal of (JᵀJ)⁻¹); NaN where the data do not determine the parameters. */
  standardDeviations: number[];
  residualSumOfSquares: number;
  /** √(residual sum of squares / degrees of freedom). */
  residualStandardDeviation: number;
  degreesOfFreedom: number;
  iterations: number;
  converged: boolean;
}

const mostIterations = 2000;
const settledStep = 1e-12;

/**
 * Nonlinear least squares by Levenberg and Marquardt from the given start values: damped steps by orthogonal factorisation, numerical
 * derivatives of fourth order, parameters scaled by their influence so far. Where a start is so far off that a first descent ends in a
 * place it should not, others are tried (damping without scale, parameters that enter in proportion put right first), and the lowest wins.
 * @throws Error where the model gives no number at the start values, or there are fewer data than parameters.
 */
export function fitNonlinear<X>(model: Model<X>, data: NonlinearData<X>, start: readonly number[]): NonlinearFit {
  if (data.x.length !== data.y.length) throw new Error(`there are ${data.x.length} x and ${data.y.length} y`);
  if (data.y.length < start.length) throw new Error(`${start.length} parameters need at least as many data, not ${data.y.length}`);
  const problem = new Problem(model, data);
  if (!Number.isFinite(problem.sum(start))) throw new Error('the model gives no number at the start values');
  const linear = problem.linearParameters(start);
  const starts = [[...start], problem.withLinearSolved(start, linear)].filter((one) => one !== null);
  let best: Descent | null = null;
  for (const from of starts) {
    for (const scaled of [true, false]) {
      for (const free of linear.length > 0 ? [linear, []] : [[]]) {
        const found = descend(problem, from, { scaled, projected: free });
        if (best === null || found.sum < best.sum * (1 - 1e-10)) best = found;
      }
    }
  }
  return summary(problem, polished(problem, best as Descent));
}

interface Descent {
  b: number[];
  sum: number;
  iterations: number;
  converged: boolean;
}

class Problem<X> {
  constructor(
    private readonly model: Model<X>,
    private readonly data: NonlinearData<X>,
  ) {}

  get size(): number {
    return this.data.y.length;
  }

  residuals(b: readonly number[]): Float64Array {
    return Float64Array.from(this.data.y, (y, i) => y - this.model(this.data.x[i] as X, b));
  }

  sum(b: readonly number[]): number {
    let sum = 0;
    for (const r of this.residuals(b)) sum += r * r;
    return sum;
  }

  /** Columns ∂f/∂b by differences over ±h and ±2h. */
  jacobian(b: readonly number[]): Float64Array[] {
    return b.map((value, j) => {
      const h = stepOf(value);
      const at = (k: number) => this.residuals(b.map((own, i) => (i === j ? value + k * h : own)));
      const [m2, m1, p1, p2] = [at(-2), at(-1), at(1), at(2)];
      return m1.map((_, i) => {
        const fourth = (8 * ((m1[i] as number) - (p1[i] as number)) - ((m2[i] as number) - (p2[i] as number))) / (12 * h);
        return Number.isFinite(fourth) ? fourth : ((m1[i] as number) - (p1[i] as number)) / (2 * h);
      });
    });
  }

  /** Parameters in which the model is straight, each and all together. */
  linearParameters(b: readonly number[]): number[] {
    const reach = (j: number) => Math.max(1, Math.abs(b[j] as number));
    const straight = b.map((_, j) => j).filter((j) => this.isStraight(b, [j], reach));
    return this.isStraight(b, straight, reach) ? straight : straight.slice(0, 1);
  }

  private isStraight(b: readonly number[], which: readonly number[], reach: (j: number) => number): boolean {
    if (which.length === 0) return true;
    const at = (k: number) => this.residuals(b.map((own, i) => (which.includes(i) ? own + k * reach(i) : own)));
    const [before, here, after] = [at(-1), at(0), at(1)];
    return here.every((value, i) => {
      const [low, high] = [before[i] as number, after[i] as number];
      return Math.abs(low - 2 * value + high) <= 1e-9 * (Math.abs(low) + Math.abs(high) + Math.abs(value)) + 1e-300;
    });
  }

  /** The same parameters with the linear ones at their best; null where that cannot be. */
  withLinearSolved(b: readonly number[], linear: readonly number[]): number[] | null {
    if (linear.length === 0) return null;
    const zero = b.map((own, i) => (linear.includes(i) ? 0 : own));
    const base = this.residuals(zero);
    if (!base.every(Number.isFinite)) return null;
    const columns = linear.map((j) => {
      const unit = this.residuals(zero.map((own, i) => (i === j ? 1 : own)));
      return base.map((value, i) => value - (unit[i] as number));
    });
    const solved = solution(columns, base);
    return solved === null ? null : b.map((own, i) => (linear.includes(i) ? (solved[linear.indexOf(i)] as number) : own));
  }
}

/** Fourth-order differences are best at about the fifth root of the rounding. */
function stepOf(value: number): number {
  const step = 2e-4 * (Math.abs(value) || 1e-2);
  return value + step - value;
}

/** Least-squares solution; null where the columns depend on each other or are no numbers. */
function solution(columns: readonly Float64Array[], y: Float64Array): Float64Array | null {
  if (!columns.every((column) => column.every(Number.isFinite))) return null;
  try {
    const qr = factorise(columns.map((column) => Float64Array.from(column)));
    const qty = Float64Array.from(y);
    applyQTransposed(qr, qty);
    const found = solveR(qr, qty);
    return found.every(Number.isFinite) ? found : null;
  } catch (error) {
    if (error instanceof SingularMatrixError) return null;
    throw error;
  }
}

interface Way {
  /** Damping in proportion to each parameter's influence, or to its size. */
  scaled: boolean;
  /** Linear parameters that are put at their best after each step. */
  projected: readonly number[];
}

function descend<X>(problem: Problem<X>, start: readonly number[], way: Way): Descent {
  let b = way.projected.length > 0 ? (problem.withLinearSolved(start, way.projected) ?? [...start]) : [...start];
  let sum = problem.sum(b);
  let [damping, grow] = [1e-3, 2];
  const scales = b.map(() => 0);
  for (let iterations = 1; iterations <= mostIterations; iterations += 1) {
    const columns = problem.jacobian(b);
    columns.forEach((column, j) => (scales[j] = Math.max(scales[j] as number, Math.hypot(...column))));
    const residuals = problem.residuals(b);
    let accepted = false;
    while (damping < 1e18) {
      const step = dampedStep(
        columns,
        residuals,
        scales.map((scale, j) => Math.sqrt(damping) * (way.scaled ? scale : sizeScale(scales, b, j))),
      );
      const moved = step === null ? null : b.map((value, j) => value + (step[j] as number));
      const trial = moved === null || way.projected.length === 0 ? moved : (problem.withLinearSolved(moved, way.projected) ?? moved);
      const trialSum = trial === null ? Infinity : problem.sum(trial);
      if (trial !== null && trialSum <= sum) {
        const small = trial.every((value, j) => Math.abs(value - (b[j] as number)) <= settledStep * (Math.abs(value) + 1e-30));
        const flat = sum - trialSum <= 1e-15 * sum;
        [b, sum, accepted] = [trial, trialSum, true];
        damping = Math.max(damping / 5, 1e-18);
        grow = 2;
        if (small || (flat && damping < 1e-6)) return { b, sum, iterations, converged: true };
        break;
      }
      damping *= grow;
      grow *= 2;
    }
    if (!accepted) return { b, sum, iterations, converged: true };
  }
  return { b, sum, iterations: mostIterations, converged: false };
}

function sizeScale(scales: readonly number[], b: readonly number[], j: number): number {
  const overall = Math.max(...scales.map((scale, i) => scale * Math.max(1e-8, Math.abs(b[i] as number))));
  return overall / Math.max(1e-8, Math.abs(b[j] as number));
}

/** Solves the columns over the diagonal of damping against the residuals. */
function dampedStep(columns: readonly Float64Array[], residuals: Float64Array, diagonal: readonly number[]): Float64Array | null {
  const rows = residuals.length;
  const stacked = columns.map((column, j) => {
    const long = new Float64Array(rows + columns.length);
    long.set(column);
    long[rows + j] = diagonal[j] as number;
    return long;
  });
  const right = new Float64Array(rows + columns.length);
  right.set(residuals);
  return solution(stacked, right);
}

const polishSteps = 20;

/** Undamped steps from the end of a descent as long as they do not lead upwards. */
function polished<X>(problem: Problem<X>, found: Descent): Descent {
  let { b, sum } = found;
  for (let k = 0; k < polishSteps; k += 1) {
    const step = solution(problem.jacobian(b), problem.residuals(b));
    if (step === null) break;
    const trial = b.map((value, j) => value + (step[j] as number));
    const trialSum = problem.sum(trial);
    if (!(trialSum <= sum * (1 + 1e-13))) break;
    const small = trial.every((value, j) => Math.abs(value - (b[j] as number)) <= 1e-14 * Math.abs(value));
    [b, sum] = [trial, trialSum];
    if (small) break;
  }
  return { ...found, b, sum };
}

function summary<X>(problem: Problem<X>, { b, sum, iterations, converged }: Descent): NonlinearFit {
  const degreesOfFreedom = problem.size - b.length;
  const variance = degreesOfFreedom > 0 ? sum / degreesOfFreedom : NaN;
  return {
    parameters: b,
    standardDeviations: unitVariances(problem, b).map((unit) => Math.sqrt(variance * unit)),
    residualSumOfSquares: sum,
    residualStandardDeviation: Math.sqrt(variance),
    degreesOfFreedom,
    iterations,
    converged,
  };
}

function unitVariances<X>(problem: Problem<X>, b: readonly number[]): number[] {
  try {
    const inverse = inverseNormal(factorise(problem.jacobian(b)));
    return inverse.map((row, j) => row[j] as number);
  } catch (error) {
    if (error instanceof SingularMatrixError) return b.map(() => NaN);
    throw error;
  }
}
