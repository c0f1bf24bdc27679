import type { PendulumSetting } from './pendulum';
import { torquePerG } from './torque';

/**
 * What a pendulum does between sources that turn at a constant rate, long after they began: the torque repeats every half turn, so the
 * angle is a mean and harmonics of twice the turntable's angle φ.
 */
export interface SteadyRotation {
  meanRad: number;
  /** Of cos 2kφ at [k − 1], rad. */
  cosine: Float64Array;
  /** Of sin 2kφ at [k − 1], rad. */
  sine: Float64Array;
}

/** Points over half a turn: harmonics fall off as the 2k-th power of arm over orbit, so that the 48th is lost in rounding. */
const points = 128;
export const steadyHarmonics = 48;
const mostRounds = 60;

const turn = (2 * Math.PI) / points;
const cosines = Float64Array.from({ length: points }, (_, j) => Math.cos(turn * j));
const sines = Float64Array.from({ length: points }, (_, j) => Math.sin(turn * j));

/**
 * The steady answer to the exact torque at ψ = φ − θ (physics.md B6): harmonic by harmonic by the transfer function
 * H(ω) = 1/{κ [1 − (ω/ω₀)² + iω/(ω₀Q)]}, again and again until θ answers to the torque at its own angle.
 * @param speedRadS of the turntable; negative clockwise
 * @throws Error where that finds no end: so near to a resonance of little damping the answer is not a sum of these harmonics
 */
export function steadyRotation({ geometry, bigG, oscillator }: PendulumSetting, speedRadS: number): SteadyRotation {
  const { inertiaKgM2, kappa, gamma } = oscillator;
  const cosine = new Float64Array(steadyHarmonics);
  const sine = new Float64Array(steadyHarmonics);
  const theta = new Float64Array(points);
  const torque = new Float64Array(points);
  for (let round = 0; round < mostRounds; round += 1) {
    for (let j = 0; j < points; j += 1) torque[j] = bigG * torquePerG(geometry, (Math.PI * j) / points - (theta[j] as number));
    const meanRad = torque.reduce((sum, one) => sum + one, 0) / points / kappa;
    const next = new Float64Array(points).fill(meanRad);
    for (let k = 1; k <= steadyHarmonics; k += 1) {
      let [p, q] = [0, 0];
      for (let j = 0; j < points; j += 1) {
        p += (torque[j] as number) * (cosines[(k * j) % points] as number);
        q += (torque[j] as number) * (sines[(k * j) % points] as number);
      }
      const omega = 2 * k * speedRadS;
      const stiff = kappa - inertiaKgM2 * omega * omega;
      const loss = 2 * inertiaKgM2 * gamma * omega;
      const scale = 2 / points / (stiff * stiff + loss * loss);
      const a = scale * (p * stiff - q * loss);
      const b = scale * (q * stiff + p * loss);
      [cosine[k - 1], sine[k - 1]] = [a, b];
      for (let j = 0; j < points; j += 1)
        next[j] = (next[j] as number) + a * (cosines[(k * j) % points] as number) + b * (sines[(k * j) % points] as number);
    }
    const change = next.reduce((most, value, j) => Math.max(most, Math.abs(value - (theta[j] as number))), 0);
    const size = next.reduce((most, value) => Math.max(most, Math.abs(value)), 0);
    theta.set(next);
    if (change <= 1e-14 * size + 1e-20) return { meanRad, cosine, sine };
    if (!Number.isFinite(size)) break;
  }
  throw new Error(
    'twice the turning rate, or a multiple of it, meets the pendulum’s own frequency with so little damping that it has no steady answer',
  );
}

/** Angle, rad, and its derivative by φ at the turntable angle φ. */
export function steadyAt({ meanRad, cosine, sine }: SteadyRotation, phiRad: number): { angleRad: number; slope: number } {
  let [angleRad, slope] = [meanRad, 0];
  for (let k = 1; k <= cosine.length; k += 1) {
    const [c, s] = [Math.cos(2 * k * phiRad), Math.sin(2 * k * phiRad)];
    const [a, b] = [cosine[k - 1] as number, sine[k - 1] as number];
    angleRad += a * c + b * s;
    slope += 2 * k * (b * c - a * s);
  }
  return { angleRad, slope };
}
