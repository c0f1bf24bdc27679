import type { RigDocument } from '../rig/document';
import { inertiaKgM2, oscillatorOf } from './oscillator';

/** Standard acceleration of free fall, m/s2: load and twist of a wire need no local value. */
const gravity = 9.80665;

interface Known {
  value: number;
  u: number;
}

/** What a round wire of the rig's dimensions does (physics.md A6, A7). Never used for G: κ goes with the fourth power of the diameter. */
export interface FibreFacts {
  /** Torsion constant of the wire itself, N m/rad, with its standard uncertainty; null without length, diameter and shear modulus. */
  kappa: Known | null;
  /** What the tension adds, N m/rad; null without length and diameter. */
  tensionKappa: number | null;
  /** The torsion constant by which the pendulum swings, N m/rad, with its standard uncertainty; null where its period is not measured. */
  periodKappa: Known | null;
  /** Pa; the pendulum's weight over the section of the wire. */
  stressPa: number;
}

/** Null where the rig's document gives no diameter. */
export function fibreFacts(rig: RigDocument): FibreFacts | null {
  const { length, diameter, shearModulus } = rig.fibre ?? {};
  if (diameter === undefined || !(diameter.value > 0)) return null;
  const { ballMass, balls, beamMass } = rig.pendulum;
  const weight = gravity * ((balls ?? 2) * ballMass.value + beamMass.value);
  return {
    kappa: length === undefined || shearModulus === undefined ? null : wireKappa(length, diameter, shearModulus),
    tensionKappa: length === undefined ? null : (weight * diameter.value ** 2) / (8 * length.value),
    periodKappa: swingKappa(rig),
    stressPa: weight / ((Math.PI * diameter.value ** 2) / 4),
  };
}

/** κ = π G D⁴ / (32 l) */
function wireKappa(length: Known, diameter: Known, shearModulus: Known): Known {
  const value = (Math.PI * shearModulus.value * diameter.value ** 4) / (32 * length.value);
  const relative = Math.hypot((4 * diameter.u) / diameter.value, length.u / length.value, shearModulus.u / shearModulus.value);
  return { value, u: value * relative };
}

/** κ = I (ω_d² + γ²); u from period, decay time and all that makes the inertia, each taken by itself. */
function swingKappa(rig: RigDocument): Known | null {
  const own = oscillatorOf(rig);
  const { period_s: period, decayTime_s: decayTime } = rig.measured ?? {};
  if (own === null || period === undefined || decayTime === undefined) return null;
  const { arm, ballMass, ballRadius, beamMass, beamLength, extraInertia } = rig.pendulum;
  const inertiaU = Math.hypot(
    2 * (arm.value ** 2 + 0.4 * ballRadius.value ** 2) * ballMass.u,
    4 * ballMass.value * arm.value * arm.u,
    1.6 * ballMass.value * ballRadius.value * ballRadius.u,
    (beamLength.value ** 2 / 12) * beamMass.u,
    ((beamMass.value * beamLength.value) / 6) * beamLength.u,
    extraInertia?.u ?? 0,
  );
  const square = own.omega0 ** 2;
  const squareU = Math.hypot((2 * own.omegaD ** 2 * period.u) / period.value, (2 * own.gamma ** 2 * decayTime.u) / decayTime.value);
  return { value: own.kappa, u: Math.hypot(inertiaU * square, inertiaKgM2(rig) * squareU) };
}

/** A wire should bear this many times its load: below, it creeps (common practice, no source). */
export const leastSafetyFactor = 2;
/** The strongest wires in use, drawn tungsten, bear up to about this much, Pa (handbooks, from memory). */
const strongestPa = 3.5e9;
/** More u than this between wire and period is no chance. */
const greatestDisagreement = 3;

/** What is wrong with a wire, in two sentences each. */
export function fibreWarnings({ kappa, tensionKappa, periodKappa, stressPa }: FibreFacts): string[] {
  const warnings: string[] = [];
  if (leastSafetyFactor * stressPa > strongestPa)
    warnings.push(
      `The pendulum pulls at the fibre with ${(stressPa / 1e9).toPrecision(3)} GPa, and no usual wire bears ${leastSafetyFactor} times that. Look at fibre.diameter and at the masses, or hang it on a thicker fibre.`,
    );
  if (kappa !== null && periodKappa !== null) {
    const apart = Math.abs(kappa.value + (tensionKappa ?? 0) - periodKappa.value) / Math.hypot(kappa.u, periodKappa.u);
    if (apart > greatestDisagreement)
      warnings.push(
        `The wire's dimensions and the measured period give torsion constants that are ${apart.toPrecision(2)} u apart. The period counts for G; one of fibre.diameter, fibre.length, fibre.shearModulus and measured.period_s is not what is built in.`,
      );
  }
  return warnings;
}
