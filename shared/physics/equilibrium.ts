import { torqueGradientPerG, torquePerG, type TorqueGeometry } from './torque';

export interface EquilibriumInput {
  geometry: TorqueGeometry;
  /** Torsion constant, N m/rad. */
  kappa: number;
  /** m3 kg-1 s-2 */
  bigG: number;
  /** Turntable angle, rad. */
  phiRad: number;
  /** Where the fibre alone would hold the arm, rad from the rest line (default 0). */
  restRad?: number;
}

const greatestStepRad = 0.1;

/**
 * Pendulum angle (rad) at which the fibre balances the sources: κ(θ − θ₀) = G g(φ − θ), by Newton's rule.
 * @throws Error when there is none to be found, that is when the sources pull harder than the fibre can hold.
 */
export function equilibriumRad({ geometry, kappa, bigG, phiRad, restRad = 0 }: EquilibriumInput): number {
  let theta = restRad;
  for (let iteration = 0; iteration < 60; iteration += 1) {
    const psi = phiRad - theta;
    const residual = kappa * (theta - restRad) - bigG * torquePerG(geometry, psi);
    const stiffness = kappa + bigG * torqueGradientPerG(geometry, psi);
    if (!(stiffness > 0)) break;
    const step = Math.max(-greatestStepRad, Math.min(greatestStepRad, -residual / stiffness));
    theta += step;
    if (Math.abs(step) <= 1e-15 + 4e-16 * Math.abs(theta)) return theta;
    if (iteration > 8 && Math.abs(step) < 1e-13) return theta;
  }
  throw new Error(
    `no stable equilibrium at the turntable angle ${((phiRad * 180) / Math.PI).toFixed(3)} deg: the sources pull harder than the fibre can hold`,
  );
}
