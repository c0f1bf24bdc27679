import type { RigDocument } from '@/shared/rig/document';

/** The free pendulum (sources away): I θ̈ + 2 I γ θ̇ + κ θ = 0. */
export interface Oscillator {
  inertiaKgM2: number;
  /** Damped angular frequency, rad/s. */
  omegaD: number;
  /** Decay rate of the amplitude, 1/s. */
  gamma: number;
  /** Undamped angular frequency, rad/s. */
  omega0: number;
  /** Torsion constant, N m/rad. */
  kappa: number;
  /** Damped period, s. */
  periodS: number;
  /** Time in which the amplitude falls to 1/e, s. */
  decayTimeS: number;
  /** Q = ω₀ / 2γ. */
  quality: number;
}

/** Moment of inertia about the fibre, kg m2: two balls on the arm, a thin uniform beam, and the extra inertia. */
export function inertiaKgM2(rig: RigDocument): number {
  const { arm, ballMass, ballRadius, beamMass, beamLength, extraInertia } = rig.pendulum;
  const balls = 2 * ballMass.value * (arm.value ** 2 + 0.4 * ballRadius.value ** 2);
  return balls + (beamMass.value * beamLength.value ** 2) / 12 + (extraInertia?.value ?? 0);
}

/** Oscillator with inertia (kg m2), damped period (s) and decay time (s); κ = I (ω_d² + γ²). */
function oscillator(inertia: number, periodS: number, decayTimeS: number): Oscillator {
  const omegaD = (2 * Math.PI) / periodS;
  const gamma = 1 / decayTimeS;
  const omega0 = Math.hypot(omegaD, gamma);
  return {
    inertiaKgM2: inertia,
    omegaD,
    gamma,
    omega0,
    kappa: inertia * omega0 * omega0,
    periodS,
    decayTimeS,
    quality: omega0 / (2 * gamma),
  };
}

/** The rig's free oscillator from `measured.period_s` and `measured.decayTime_s`; null when either is missing. */
export function oscillatorOf(rig: RigDocument): Oscillator | null {
  const period = rig.measured?.period_s?.value;
  const decayTime = rig.measured?.decayTime_s?.value;
  if (period === undefined || decayTime === undefined) return null;
  return oscillator(inertiaKgM2(rig), period, decayTime);
}
