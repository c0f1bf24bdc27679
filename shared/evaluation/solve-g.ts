import { equilibriumRad } from '../physics/equilibrium';
import { torqueGradientPerG, torquePerG, type TorqueGeometry } from '../physics/torque';
import type { FreeOscillator } from './free-oscillator';
import type { RingDownResult } from './ring-down-fit';

/** Everything that G follows from, as plain numbers. */
export interface GSystem {
  geometry: TorqueGeometry;
  inertiaKgM2: number;
  /** Near minus far, drift removed, rad: Σ weight · centre over the members. */
  reversalRad: number;
  members: { phiRad: number; weight: number }[];
  oscillator: OscillatorSource;
}

export type RingDownFrequencies = Pick<RingDownResult, 'omega' | 'gamma' | 'omegaByShift' | 'gammaByShift'>;

/** ω (rad/s) and γ (1/s) measured beforehand, where they were. */
export interface MeasuredValues {
  omega: { value: number } | null;
  gamma: { value: number } | null;
}

/** Where κ/I and γ come from. */
export type OscillatorSource =
  | { kind: 'given'; omega0Squared: number; gamma: number }
  /** Ring-down and measured values with fixed shares; the ring-down answers to the stiffness of the sources. */
  | {
      kind: 'combined';
      ringDown: RingDownFrequencies | null;
      measured: MeasuredValues;
      share: FreeOscillator['ringDownShare'];
      segments: { phiRad: number; shift: number }[];
    };

export interface GSolution {
  bigG: number;
  kappa: number;
  omega0Squared: number;
  gamma: number;
}

export class NoSolutionError extends Error {}

/**
 * The G at which the equilibria at the achieved angles differ as the dwells do, together with the κ that the
 * ring-down, freed of the sources' stiffness at that G, and the measured period give.
 * @throws NoSolutionError when near and far pull alike, or the sources pull harder than the fibre holds.
 */
export function solveG(system: GSystem, startG: number): GSolution {
  const groups = grouped(system.members);
  let bigG = startG;
  for (let iteration = 0; iteration < 60; iteration += 1) {
    const free = freeAt(system, bigG);
    const kappa = system.inertiaKgM2 * free.omega0Squared;
    const next = gAtKappa(system, groups, { kappa, bigG });
    const change = Math.abs(next - bigG);
    bigG = next;
    if (change <= 1e-14 * Math.abs(bigG)) return { bigG, kappa, ...free };
  }
  const free = freeAt(system, bigG);
  return { bigG, kappa: system.inertiaKgM2 * free.omega0Squared, ...free };
}

/** κ/I and γ of the free pendulum if G were `bigG`. */
export function freeAt(system: GSystem, bigG: number): { omega0Squared: number; gamma: number } {
  const source = system.oscillator;
  if (source.kind === 'given') return source;
  let omega = source.ringDown?.omega ?? 0;
  let gamma = source.ringDown?.gamma ?? 0;
  if (source.ringDown !== null) {
    const first = source.ringDown.omega ** 2 + source.ringDown.gamma ** 2;
    const shifts = stiffnessShifts(system, { bigG, kappa: system.inertiaKgM2 * first, angles: source.segments.map((one) => one.phiRad) });
    source.segments.forEach(({ shift }, i) => {
      const change = (shifts[i] as number) - shift;
      omega += (source.ringDown?.omegaByShift[i] as number) * change;
      gamma += (source.ringDown?.gammaByShift[i] as number) * change;
    });
  }
  const { measured, share } = source;
  const combinedOmega = share.omega * omega + (1 - share.omega) * (measured.omega?.value ?? 0);
  const combinedGamma = share.gamma * gamma + (1 - share.gamma) * (measured.gamma?.value ?? 0);
  return { omega0Squared: combinedOmega ** 2 + combinedGamma ** 2, gamma: combinedGamma };
}

/** What the sources add to ω² at each angle, rad2/s2: G g'(φ − θ)/I at the equilibrium. */
export function stiffnessShifts(
  { geometry, inertiaKgM2 }: Pick<GSystem, 'geometry' | 'inertiaKgM2'>,
  { bigG, kappa, angles }: { bigG: number; kappa: number; angles: readonly number[] },
): number[] {
  const known = new Map<number, number>();
  return angles.map((phiRad) => {
    const before = known.get(phiRad);
    if (before !== undefined) return before;
    const theta = solvable(() => equilibriumRad({ geometry, kappa, bigG, phiRad }));
    const shift = (bigG * torqueGradientPerG(geometry, phiRad - theta)) / inertiaKgM2;
    known.set(phiRad, shift);
    return shift;
  });
}

/** Dwells at one and the same angle share their equilibrium. */
function grouped(members: GSystem['members']): GSystem['members'] {
  const byAngle = new Map<number, number>();
  for (const { phiRad, weight } of members) byAngle.set(phiRad, (byAngle.get(phiRad) ?? 0) + weight);
  return [...byAngle].map(([phiRad, weight]) => ({ phiRad, weight }));
}

function gAtKappa(system: GSystem, groups: GSystem['members'], from: { kappa: number; bigG: number }): number {
  const { geometry, reversalRad } = system;
  let bigG = from.bigG;
  for (let iteration = 0; iteration < 40; iteration += 1) {
    let difference = 0;
    let slope = 0;
    let sizes = 0;
    for (const { phiRad, weight } of groups) {
      const theta = solvable(() => equilibriumRad({ geometry, kappa: from.kappa, bigG, phiRad }));
      difference += weight * theta;
      const pull = (weight * torquePerG(geometry, phiRad - theta)) / (from.kappa + bigG * torqueGradientPerG(geometry, phiRad - theta));
      slope += pull;
      sizes += Math.abs(pull);
    }
    if (!(Math.abs(slope) > 1e-6 * sizes))
      throw new NoSolutionError(
        'near and far pull the pendulum alike, so their difference says nothing about G: look at stations and sources',
      );
    const step = (reversalRad - difference) / slope;
    bigG += step;
    if (Math.abs(step) <= 1e-15 * Math.abs(bigG)) break;
  }
  if (!Number.isFinite(bigG)) throw new NoSolutionError('no G gives the observed difference');
  return bigG;
}

function solvable<T>(compute: () => T): T {
  try {
    return compute();
  } catch (error) {
    throw new NoSolutionError(error instanceof Error ? error.message : 'no equilibrium');
  }
}
