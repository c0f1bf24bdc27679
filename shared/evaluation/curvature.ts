import { equilibriumRad } from '../physics/equilibrium';
import { torqueGradientPerG, torquePerG } from '../physics/torque';
import { cosine, offset, ringDownSegment, sine } from '../statistics/ring-down';
import { isOscillation } from '../statistics/ring-down-start';
import { fitSeparable, solveAtFixedAlpha } from '../statistics/variable-projection';
import type { Segment } from './analysis';
import type { DwellFit, FitBias, Ringing, Start } from './ring-down-fit';
import type { GSolution, GSystem } from './solve-g';

/**
 * The dwell model is linear, the sources' torque is not: its curvature rectifies the ringing, so that the fitted centre is not
 * the equilibrium, and it shifts the frequency. What the exact equation gives with the same ringing, fitted by the same model, shows by
 * how much; taking that off and solving again settles in a few rounds.
 */

/** Kicks between the instants at which the exact series is read: two readings for each datum, three kicks to a reading. */
const kicksPerReading = 3;

/** By how much the linear model misses centre, frequency and decay at a solution, with the stiffness of the sources (rad2/s2) that goes with it. */
export function curvatureBias(
  segments: readonly Segment[],
  found: DwellFit,
  at: { system: GSystem; solution: GSolution; shifts: readonly number[]; before: FitBias | null },
): FitBias {
  const { system, solution, shifts, before } = at;
  const { gamma } = solution;
  const omega = Math.sqrt(solution.omega0Squared - gamma * gamma);
  const starts = segments.map((segment, i) => startOf(found, i, { before, omega: segmentOmega(omega, shifts[i] as number) }));
  const exact = segments.map((segment, i) => {
    const y = exactRinging(segment, { system, solution, start: starts[i] as Start });
    return ringDownSegment({
      tS: segment.averages.t,
      y,
      weight: segment.averages.weight,
      centreS: segment.centreS,
      shift: shifts[i] as number,
    });
  });
  const fit =
    found.ringDown === null
      ? solveAtFixedAlpha(exact, [omega, gamma])
      : fitSeparable(exact, [omega, gamma], { allowed: isOscillation, tolerance: 1e-10 });
  return {
    centres: fit.segments.map(({ coefficients }) => coefficients[offset] as number),
    omega: (fit.alpha[0] as number) - omega,
    gamma: (fit.alpha[1] as number) - gamma,
    starts,
    ringing: fit.segments.map(ringingOf),
  };
}

const segmentOmega = (omega: number, shift: number) => Math.sqrt(omega * omega + shift);

function ringingOf({ coefficients }: { coefficients: Float64Array }): Ringing {
  return { a: coefficients[cosine] as number, b: coefficients[sine] as number };
}

/**
 * State at the start of a window, rad and rad/s. At first from the fitted amplitudes as if the pendulum were linear; later from what
 * the exact series lacked of the amplitudes fitted to the data.
 */
function startOf(found: DwellFit, index: number, { before, omega }: { before: FitBias | null; omega: number }): Start {
  const gamma = found.fit.alpha[1] as number;
  const fitted = ringingOf(found.fit.segments[index] as { coefficients: Float64Array });
  const known = before?.starts[index];
  const shown = before?.ringing[index];
  if (known === undefined || shown === undefined) return { x: fitted.a, v: omega * fitted.b - gamma * fitted.a };
  const lacking = { a: fitted.a - shown.a, b: fitted.b - shown.b };
  return { x: known.x + lacking.a, v: known.v + omega * lacking.b - gamma * lacking.a };
}

/**
 * Departure from the equilibrium, averaged as the data are: the linear part is stepped exactly, the rest of the torque, a
 * thousandth of it, acts as kicks in between (Strang splitting).
 */
function exactRinging(segment: Segment, { system, solution, start }: { system: GSystem; solution: GSolution; start: Start }): Float64Array {
  const { geometry, inertiaKgM2 } = system;
  const { bigG, kappa, gamma } = solution;
  const phiRad = ((segment.window.angleDeg ?? 0) * Math.PI) / 180;
  const psi = phiRad - equilibriumRad({ geometry, kappa, bigG, phiRad });
  const torque = torquePerG(geometry, psi);
  const gradient = torqueGradientPerG(geometry, psi);
  const kick = (x: number) => (bigG / inertiaKgM2) * (torquePerG(geometry, psi - x) - torque + gradient * x);
  const omega0Squared = solution.omega0Squared + (bigG * gradient) / inertiaKgM2;
  const step = propagator(omega0Squared, gamma);
  let { x, v } = start;
  let at = 0;
  const readAt = (tS: number): number => {
    const h = (tS - at) / kicksPerReading;
    const advance = step(h);
    for (let k = 0; k < kicksPerReading; k += 1) {
      v += (h / 2) * kick(x);
      [x, v] = advance(x, v);
      v += (h / 2) * kick(x);
    }
    at = tS;
    return x;
  };
  const { t, spreadS } = segment.averages;
  // Two readings at the spread of the samples about their mean average as the samples do, to the third order.
  return t.map((tS, i) => (readAt(tS - (spreadS[i] as number)) + readAt(tS + (spreadS[i] as number))) / 2);
}

/** Exact step of the damped oscillator over h seconds. */
function propagator(omega0Squared: number, gamma: number): (h: number) => (x: number, v: number) => [number, number] {
  const omega = Math.sqrt(omega0Squared - gamma * gamma);
  return (h) => {
    const decay = Math.exp(-gamma * h);
    const [cos, sin] = [decay * Math.cos(omega * h), decay * Math.sin(omega * h)];
    const [xx, xv, vx, vv] = [cos + (gamma / omega) * sin, sin / omega, -(omega0Squared / omega) * sin, cos - (gamma / omega) * sin];
    return (x, v) => [xx * x + xv * v, vx * x + vv * v];
  };
}

/** The same fit with the bias taken off. */
export function withoutBias(found: DwellFit, bias: FitBias): DwellFit {
  const { ringDown } = found;
  return {
    ...found,
    bias,
    ringDown: ringDown === null ? null : { ...ringDown, omega: ringDown.omega - bias.omega, gamma: ringDown.gamma - bias.gamma },
  };
}
