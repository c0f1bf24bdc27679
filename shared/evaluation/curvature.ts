import { equilibriumRad } from '../physics/equilibrium';
import { torqueGradientPerG, torquePerG } from '../physics/torque';
import { cosine, offset, ringDownSegment, sine } from '../statistics/ring-down';
import { isOscillation } from '../statistics/ring-down-start';
import { fitSeparable, solveAtFixedAlpha } from '../statistics/variable-projection';
import type { Segment } from './analysis';
import type { DwellFit, FitBias } from './ring-down-fit';
import type { GSolution, GSystem } from './solve-g';

/**
 * The dwell model is linear, the sources' torque is not: its curvature rectifies the ringing, so that the fitted centre is not
 * the equilibrium, and it shifts the frequency. What the exact equation gives with the same ringing, fitted by the same model, shows by
 * how much; taking that off and solving again settles in a few rounds.
 */

const stepsPerDatum = 2;

/** By how much the linear model misses centre, frequency and decay at a solution, with the stiffness of the sources (rad2/s2) that goes with it. */
export function curvatureBias(
  segments: readonly Segment[],
  found: DwellFit,
  { system, solution, shifts }: { system: GSystem; solution: GSolution; shifts: readonly number[] },
): FitBias {
  const { gamma } = solution;
  const omega = Math.sqrt(solution.omega0Squared - gamma * gamma);
  const exact = segments.map((segment, i) => {
    const y = exactRinging(segment, { system, solution, start: startOf(found, i, segment) });
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
      : fitSeparable(exact, [omega, gamma], { allowed: isOscillation, tolerance: 1e-9 });
  return {
    centres: fit.segments.map(({ coefficients }) => coefficients[offset] as number),
    omega: (fit.alpha[0] as number) - omega,
    gamma: (fit.alpha[1] as number) - gamma,
  };
}

interface Start {
  /** Departure from the equilibrium, rad, and its rate, rad/s, at the start of the window. */
  x: number;
  v: number;
}

function startOf(found: DwellFit, index: number, { averages: { t, weight } }: Segment): Start {
  const { coefficients } = found.fit.segments[index] as { coefficients: Float64Array };
  const [omega, gamma] = found.fit.alpha as [number, number];
  const [a, b] = [coefficients[cosine] as number, coefficients[sine] as number];
  // Averaging over a box of width w takes about (ωw)²/24 off the amplitude.
  const boxS = (weight[0] as number) > 1 ? (t[1] as number) - (t[0] as number) : 0;
  const gain = 1 - (omega * boxS) ** 2 / 24;
  return { x: a / gain, v: (omega * b - gamma * a) / gain };
}

/**
 * Departure from the equilibrium at the instants of the data: the linear part is stepped exactly, the rest of the torque, a
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
  return segment.averages.t.map((tS) => {
    const h = (tS - at) / stepsPerDatum;
    const advance = step(h);
    for (let k = 0; k < stepsPerDatum; k += 1) {
      v += (h / 2) * kick(x);
      [x, v] = advance(x, v);
      v += (h / 2) * kick(x);
    }
    at = tS;
    return x;
  });
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
