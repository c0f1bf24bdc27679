import { at, bilinear, type Matrix, SingularMatrixError, solveSymmetric } from '../statistics/symmetric';
import { leastSquares } from '../statistics/least-squares';
import { offset, ringDownSegment, type RingDownData } from '../statistics/ring-down';
import { isOscillation, type RingDownStart } from '../statistics/ring-down-start';
import { fitSeparable, solveAtFixedAlpha, type SeparableFit, type SeparableSegment } from '../statistics/variable-projection';

/** What the dwells themselves say about the free pendulum. */
export interface RingDownResult {
  /** Free damped angular frequency, rad/s, and decay rate, 1/s: what the pendulum would do without the sources. */
  omega: number;
  gamma: number;
  /** Covariance of (ω, γ). */
  covariance: Matrix;
  degreesOfFreedom: number;
  /** How ω and γ would change if the sources stiffened segment i by d(shift), per rad2/s2. */
  omegaByShift: number[];
  gammaByShift: number[];
}

/** What a fit by the linear model is off by. */
export interface FitBias {
  /** Of each segment's centre, rad. */
  centres: number[];
  omega: number;
  gamma: number;
  /** The states from which the exact series began and the jumps at its knocks, and the amplitudes that the linear model found in it. */
  starts: Start[][];
  ringing: Ringing[][];
  /** What the linear model leaves of the exact series, each datum times the root of its weight. */
  residuals: Float64Array[];
}

/** Departure from the equilibrium, rad, and its rate, rad/s, at the start of a window; at a knock: by how much they jump. */
export interface Start {
  atS: number;
  x: number;
  v: number;
}

/** Amplitudes of cosine and sine, rad; at a knock: those that are added. */
export interface Ringing {
  a: number;
  b: number;
}

export interface DwellFit {
  fit: SeparableFit;
  /** Taken off the centres and off the ring-down; null while it is not known. */
  bias: FitBias | null;
  /** Null where the dwells hold no ringing to speak of and ω, γ were held at the measured ones. */
  ringDown: RingDownResult | null;
  /** Covariance of the (ω, γ) that the centres were fitted with. */
  alphaCovariance: Matrix;
  /** How many times more the errors of the data move (ω, γ) than the weights of the fit say. */
  loosening: number;
}

/** The same fit where the errors of the data move it so many times as much as its weights say. */
export function loosened(found: DwellFit, by: number): DwellFit {
  if (found.ringDown === null || by === 1) return found;
  const alphaCovariance = found.alphaCovariance.map((row) => row.map((value) => by * by * value));
  return { ...found, alphaCovariance, loosening: by, ringDown: { ...found.ringDown, covariance: alphaCovariance } };
}

/** Ringing that explains less than this many times what noise alone would is none. */
const leastSignificance = 10;

/** A clear ringing leaves less than this share of the motion unexplained. */
const unexplainedShare = 0.1;

/**
 * Fits all segments with one ω and γ. Without ringing, or with none that tells a frequency, both are held at `measured`.
 * Returns null when there is neither.
 */
export function fitRingDown(data: readonly RingDownData[], start: RingDownStart | null, measured: HeldOscillation | null): DwellFit | null {
  const segments = data.map(ringDownSegment);
  if (start !== null) {
    const fit = tryFit(segments, start);
    if (fit !== null && tells(fit, data, measured)) {
      const alphaCovariance = honestCovariance(fit);
      return {
        fit,
        bias: null,
        loosening: 1,
        alphaCovariance,
        ringDown: {
          ...shiftDerivatives(fit),
          omega: fit.alpha[0] as number,
          gamma: fit.alpha[1] as number,
          covariance: alphaCovariance,
          degreesOfFreedom: Math.max(1, data.length - 2),
        },
      };
    }
  }
  if (measured === null) return null;
  return {
    fit: solveAtFixedAlpha(segments, [measured.omega, measured.gamma]),
    bias: null,
    loosening: 1,
    ringDown: null,
    alphaCovariance: measured.covariance,
  };
}

/** ω (rad/s) and γ (1/s) known from elsewhere, with their covariance. */
export interface HeldOscillation {
  omega: number;
  gamma: number;
  covariance: Matrix;
}

/** Null where the data hold no trace of an oscillation at all. */
function tryFit(segments: readonly SeparableSegment[], start: RingDownStart): SeparableFit | null {
  try {
    return fitSeparable(segments, [start.omega, start.gamma], { allowed: isOscillation });
  } catch (error) {
    if (error instanceof SingularMatrixError) return null;
    throw error;
  }
}

/**
 * Whether the fit found a ringing. A wandering zero can be fitted by a slow wave too, so a wave that explains less than most of
 * the motion within the dwells is believed only where it agrees with the measured period, if there is one.
 */
function tells(fit: SeparableFit, data: readonly RingDownData[], measured: HeldOscillation | null): boolean {
  const [omega] = fit.alpha as [number, number];
  const u = Math.sqrt(at(honestCovariance(fit), 0, 0));
  if (!isOscillation(fit.alpha) || !(u < 0.05 * omega)) return false;
  const withoutRinging = data.reduce((sum, one) => sum + straightResidual(one), 0);
  if ((withoutRinging - fit.ssr) / (2 * data.length + 2) <= leastSignificance * fit.variance) return false;
  if (measured === null || fit.ssr < unexplainedShare * withoutRinging) return true;
  return Math.abs(omega - measured.omega) <= 3 * Math.hypot(u, Math.sqrt(at(measured.covariance, 0, 0)));
}

function straightResidual({ tS, y, weight }: RingDownData): number {
  const root = weight?.map(Math.sqrt) ?? tS.map(() => 1);
  return leastSquares(
    [root, tS.map((t, i) => t * (root[i] as number))],
    y.map((value, i) => value * (root[i] as number)),
  ).ssr;
}

/**
 * Residuals of a dwell hang together (drift, seismic noise), so the covariance that takes them as independent may be far too
 * small. The scatter of what each whole dwell says about (ω, γ) does not have that fault; the greater of the two is used.
 */
export function honestCovariance(fit: SeparableFit): Matrix {
  const count = fit.segments.length;
  if (count < 4) return fit.alphaCovariance;
  const steps = ownSteps(fit);
  const between = fit.alpha.map((_, i) =>
    fit.alpha.map((__, j) => (count / (count - 2)) * steps.reduce((sum, step) => sum + (step[i] as number) * (step[j] as number), 0)),
  );
  return at(between, 0, 0) > at(fit.alphaCovariance, 0, 0) ? between : fit.alphaCovariance;
}

/** By how much each segment alone moves (ω, γ). */
export function ownSteps(fit: SeparableFit): number[][] {
  const inverse = fit.alpha.map((_, j) =>
    solveSymmetric(
      fit.information,
      fit.alpha.map((__, i) => (i === j ? 1 : 0)),
    ),
  );
  return fit.segments.map(({ score }) => inverse.map((row) => row.reduce((sum, value, i) => sum + value * (score[i] as number), 0)));
}

function shiftDerivatives(fit: SeparableFit): Pick<RingDownResult, 'omegaByShift' | 'gammaByShift'> {
  // With ωᵢ² = ω² + sᵢ, a change of sᵢ is to segment i what a change of ω by ds/2ω is; the fit takes it back.
  const pull = -1 / (2 * (fit.alpha[0] as number));
  const changes = fit.segments.map(({ information }) =>
    solveSymmetric(fit.information, [at(information, 0, 0) * pull, at(information, 1, 0) * pull]),
  );
  return {
    omegaByShift: changes.map(([omegaChange]) => omegaChange as number),
    gammaByShift: changes.map(([, gammaChange]) => gammaChange as number),
  };
}

export interface CentreFit {
  value: number;
  u: number;
  /** ∂centre/∂(ω, γ) */
  shift: number[];
}

/** Centre of a segment, rad, freed of the model's bias where it is known, with its uncertainty from the residuals and from ω and γ. */
export function centreOf(found: DwellFit, index: number): CentreFit {
  const segment = found.fit.segments[index];
  if (segment === undefined) throw new Error(`there is no segment ${index}`);
  const shift = segment.shift[offset] as number[];
  const own = Number.isFinite(found.fit.variance) ? found.fit.variance * at(segment.inverseNormal, offset, offset) : 0;
  return {
    value: (segment.coefficients[offset] as number) - (found.bias?.centres[index] ?? 0),
    u: Math.sqrt(own + bilinear(shift, found.alphaCovariance, shift)),
    shift,
  };
}
