import { equilibriumRad } from '../physics/equilibrium';
import { torqueGradientPerG, torquePerG } from '../physics/torque';
import { cosine, offset, ringDownSegment, sine } from '../statistics/ring-down';
import { isOscillation } from '../statistics/ring-down-start';
import { fitSeparable, solveAtFixedAlpha } from '../statistics/variable-projection';
import { dataOf, type Segment } from './segment';
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
  const starts = segments.map((segment, i) => {
    const own = before === null ? null : { starts: before.starts[i] ?? [], ringing: before.ringing[i] ?? [] };
    const setting = { omega: Math.sqrt(omega * omega + (shifts[i] as number)), gamma: found.fit.alpha[1] as number, before: own };
    return startsOf(segment, found.fit.segments[i] as { coefficients: Float64Array }, setting);
  });
  const exact = segments.map((segment, i) => {
    const y = exactRinging(segment, { system, solution, starts: starts[i] as Start[] });
    return ringDownSegment({ ...dataOf(segment), y, shift: shifts[i] as number });
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
    residuals: fit.segments.map(({ residuals }) => residuals),
  };
}

/** The amplitudes from the window's start on, then those that each knock adds. */
function ringingOf({ coefficients }: { coefficients: Float64Array }): Ringing[] {
  return Array.from({ length: (coefficients.length - cosine) / 2 }, (_, k) => ({
    a: coefficients[cosine + 2 * k] as number,
    b: coefficients[sine + 2 * k] as number,
  }));
}

/**
 * States at the start of a window and at its knocks, rad and rad/s. At first from the fitted amplitudes as if the pendulum were linear;
 * later from what the exact series lacked of the amplitudes fitted to the data.
 */
function startsOf(segment: Segment, fit: { coefficients: Float64Array }, { omega, gamma, before }: StartSetting): Start[] {
  return ringingOf(fit).map((fitted, k) => {
    const atS = k === 0 ? 0 : (segment.knocksS[k - 1] as number);
    const known = before?.starts[k];
    const shown = before?.ringing[k];
    if (known === undefined || shown === undefined) return stateAt(atS, fitted, { omega, gamma });
    const lacking = stateAt(atS, { a: fitted.a - shown.a, b: fitted.b - shown.b }, { omega, gamma });
    return { atS, x: known.x + lacking.x, v: known.v + lacking.v };
  });
}

interface StartSetting {
  omega: number;
  gamma: number;
  before: { starts: readonly Start[]; ringing: readonly Ringing[] } | null;
}

/** e^(−γt)(a cos ωt + b sin ωt) and its rate at an instant. */
function stateAt(atS: number, { a, b }: Ringing, { omega, gamma }: { omega: number; gamma: number }): Start {
  const decay = Math.exp(-gamma * atS);
  const [cos, sin] = [decay * Math.cos(omega * atS), decay * Math.sin(omega * atS)];
  return { atS, x: a * cos + b * sin, v: (omega * b - gamma * a) * cos - (omega * a + gamma * b) * sin };
}

/**
 * Departure from the equilibrium, averaged as the data are: the linear part is stepped exactly, the rest of the torque, a
 * thousandth of it, acts as kicks in between (Strang splitting).
 */
function exactRinging(
  segment: Segment,
  { system, solution, starts }: { system: GSystem; solution: GSolution; starts: readonly Start[] },
): Float64Array {
  const { geometry, inertiaKgM2 } = system;
  const { bigG, kappa, gamma } = solution;
  const phiRad = ((segment.window.angleDeg ?? 0) * Math.PI) / 180;
  const psi = phiRad - equilibriumRad({ geometry, kappa, bigG, phiRad });
  const torque = torquePerG(geometry, psi);
  const gradient = torqueGradientPerG(geometry, psi);
  const kick = (x: number) => (bigG / inertiaKgM2) * (torquePerG(geometry, psi - x) - torque + gradient * x);
  const step = propagator(solution.omega0Squared + (bigG * gradient) / inertiaKgM2, gamma);
  let [at, x, v] = [0, 0, 0];
  let jumps = 0;
  const goTo = (tS: number) => {
    const h = (tS - at) / kicksPerReading;
    const advance = step(h);
    for (let k = 0; k < kicksPerReading; k += 1) {
      v += (h / 2) * kick(x);
      [x, v] = advance(x, v);
      v += (h / 2) * kick(x);
    }
    at = tS;
  };
  const readAt = (tS: number): number => {
    for (let next = starts[jumps]; next !== undefined && next.atS <= tS; next = starts[jumps]) {
      if (next.atS > at) goTo(next.atS);
      [x, v] = [x + next.x, v + next.v];
      jumps += 1;
    }
    goTo(tS);
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
