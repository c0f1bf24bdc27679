import type { SourcePair, TorqueGeometry } from '../physics/torque';
import { torquePerG } from '../physics/torque';
import { RAD_PER_DEG } from '../physics/constants';

/**
 * G by the equilibrium method in closed form, for one near and one far equilibrium: κ S / (g(φN − θN) − g(φF − θF)). Cylinders count as
 * spheres and the ring-down as free here; what that misses is small and is put right to first order by the trials.
 */
export interface TrialCore {
  geometry: TorqueGeometry;
  ballRadiusM: number;
  extraInertia: number;
  nearDeg: number;
  farDeg: number;
  /** Equilibria, rad. */
  nearRad: number;
  farRad: number;
  reversalRad: number;
  periodS: number;
  decayTimeS: number;
}

export function gOfCore(core: TrialCore): number {
  const { geometry, ballRadiusM, extraInertia, reversalRad, periodS, decayTimeS } = core;
  const { armM, ballMassKg, beamMassKg, beamHalfLengthM } = geometry;
  const inertia =
    2 * ballMassKg * (armM * armM + 0.4 * ballRadiusM * ballRadiusM) + (beamMassKg * beamHalfLengthM * beamHalfLengthM) / 3 + extraInertia;
  const omega = (2 * Math.PI) / periodS;
  const kappa = inertia * (omega * omega + 1 / (decayTimeS * decayTimeS));
  const near = torquePerG(geometry, core.nearDeg * RAD_PER_DEG - core.nearRad);
  const far = torquePerG(geometry, core.farDeg * RAD_PER_DEG - core.farRad);
  return (kappa * reversalRad) / (near - far);
}

/** Sets one input by its name in the budget; an input that the closed form does not hold is passed over. */
export type Setter = (value: number) => void;

export function setterOf(core: TrialCore, input: string): Setter | null {
  const { geometry } = core;
  const main = geometry.pairs[0];
  const setters: Record<string, Setter> = {
    'pendulum.arm': (value) => (geometry.armM = value),
    'pendulum.ballMass': (value) => (geometry.ballMassKg = value),
    'pendulum.ballRadius': (value) => (core.ballRadiusM = value),
    'pendulum.beamMass': (value) => (geometry.beamMassKg = value),
    'pendulum.beamLength': (value) => (geometry.beamHalfLengthM = value / 2),
    'pendulum.extraInertia': (value) => (core.extraInertia = value),
    'stations.near': (value) => (core.nearDeg = value),
    'stations.far': (value) => (core.farDeg = value),
    reversal_rad: (value) => (core.reversalRad = value),
    period_s: (value) => (core.periodS = value),
    decayTime_s: (value) => (core.decayTimeS = value),
    ...(main === undefined ? {} : pairSetters('sources', main)),
  };
  return setters[input] ?? null;
}

function pairSetters(path: string, pair: SourcePair): Record<string, Setter> {
  return {
    [`${path}.mass`]: (value) => (pair.massKg = value),
    [`${path}.orbit`]: (value) => (pair.orbitM = value),
    [`${path}.offset`]: (value) => (pair.offsetM = value),
  };
}
