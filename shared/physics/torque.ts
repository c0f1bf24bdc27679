import type { RigDocument } from '@/shared/rig/document';
import { RAD_PER_DEG } from './constants';
import { cylinderPull, type Pull } from './cylinder';
import { gaussLegendre } from '@/shared/statistics/gauss-legendre';
import { splined, type ValueAndSlope } from './torque-table';

/** One kind of attracting body on the turntable, present twice, opposite each other. */
export interface SourcePair {
  /** Mass of each body, kg. */
  massKg: number;
  /** Turntable axis to the body's centre, m. */
  orbitM: number;
  /** Height of the body's centre above the ball centres, m. */
  offsetM: number;
  /** Direction counted from the main source, rad. */
  angleRad: number;
  /** Cylinders only: their pull over distance (`cylinderPull`), and the torque of a pair of unit mass over G as a spline of ψ. */
  cylinder?: { pull: (squareM2: number) => Pull; torque: (psiRad: number) => ValueAndSlope };
}

/** All that the gravitational torque depends on, as plain numbers. */
export interface TorqueGeometry {
  /** Fibre axis to the centre of a ball, m. */
  armM: number;
  /** Mass of each ball, kg. */
  ballMassKg: number;
  beamMassKg: number;
  /** Half the length of the thin uniform beam, m. */
  beamHalfLengthM: number;
  pairs: SourcePair[];
}

type Pendulum = Omit<TorqueGeometry, 'pairs'>;

/** The geometry of a rig. A rig with `sources.shape` `none` keeps only what else turns along (`sources.extra`). */
export function geometryOf(rig: RigDocument): TorqueGeometry {
  const { sources } = rig;
  const pendulum = pendulumOf(rig);
  const pairs = sources.shape === 'none' ? [] : [mainPair(rig, pendulum)];
  for (const part of sources.extra ?? []) {
    pairs.push({
      massKg: part.mass.value,
      orbitM: part.orbit.value,
      offsetM: part.offset.value,
      angleRad: part.angle.value * RAD_PER_DEG,
    });
  }
  return { ...pendulum, pairs };
}

function pendulumOf({ pendulum: { arm, ballMass, beamMass, beamLength } }: RigDocument): Pendulum {
  return { armM: arm.value, ballMassKg: ballMass.value, beamMassKg: beamMass.value, beamHalfLengthM: beamLength.value / 2 };
}

function mainPair({ sources }: RigDocument, pendulum: Pendulum): SourcePair {
  const { mass, orbit, radius, height, offset, shape } = sources;
  if (mass === undefined || orbit === undefined) throw new Error(`sources.mass and sources.orbit are needed for shape ${shape}`);
  const pair: SourcePair = { massKg: mass.value, orbitM: orbit.value, offsetM: offset?.value ?? 0, angleRad: 0 };
  if (shape !== 'cylinder') return pair;
  if (radius === undefined || height === undefined) throw new Error('sources.radius and sources.height are needed for cylinders');
  const pull = cylinderPull({ radiusM: radius.value, heightM: height.value, offsetM: pair.offsetM });
  return { ...pair, cylinder: { pull, torque: splined((psiRad) => cylinderTorque(pendulum, { orbitM: pair.orbitM, pull }, psiRad)) } };
}

/**
 * Gravitational torque on the pendulum divided by G, kg2/m, at ψ = turntable angle − pendulum angle (rad). Uniform
 * spheres count as points, cylinders as what they are, the beam as a thin uniform rod. Odd in ψ, period π.
 */
export function torquePerG(geometry: TorqueGeometry, psiRad: number): number {
  let sum = 0;
  for (const pair of geometry.pairs) {
    const psi = psiRad + pair.angleRad;
    sum += pair.cylinder === undefined ? pairTorque(geometry, pair, psi) : pair.massKg * pair.cylinder.torque(psi).value;
  }
  return sum;
}

/** Derivative of `torquePerG` by ψ, kg2 m-1 rad-1. The stiffness seen by the pendulum is κ + G times this. */
export function torqueGradientPerG(geometry: TorqueGeometry, psiRad: number): number {
  let sum = 0;
  for (const pair of geometry.pairs) {
    const psi = psiRad + pair.angleRad;
    sum += pair.cylinder === undefined ? pairGradient(geometry, pair, psi) : pair.massKg * pair.cylinder.torque(psi).slope;
  }
  return sum;
}

function pairTorque(geometry: TorqueGeometry, pair: SourcePair, psiRad: number): number {
  const sin = Math.sin(psiRad);
  const cos = Math.cos(psiRad);
  const arm = geometry.armM;
  const points = 2 * geometry.ballMassKg * pair.massKg * arm * pair.orbitM * sin * ballBracket(arm, pair, cos);
  return points + beamTorque(geometry, pair, { sin, cos });
}

function pairGradient(geometry: TorqueGeometry, pair: SourcePair, psiRad: number): number {
  const sin = Math.sin(psiRad);
  const cos = Math.cos(psiRad);
  const arm = geometry.armM;
  const { minus, plus } = squaredDistances(arm, pair, cos);
  const bracket = cos * ballBracket(arm, pair, cos) - 3 * arm * pair.orbitM * sin * sin * (minus ** -2.5 + plus ** -2.5);
  return 2 * geometry.ballMassKg * pair.massKg * arm * pair.orbitM * bracket + beamGradient(geometry, pair, { sin, cos });
}

/** Squared distances from a source to the ball on its side and to the one opposite, m2. */
function squaredDistances(arm: number, pair: SourcePair, cos: number): { minus: number; plus: number } {
  const square = arm * arm + pair.orbitM * pair.orbitM + pair.offsetM * pair.offsetM;
  const product = 2 * arm * pair.orbitM * cos;
  return { minus: square - product, plus: square + product };
}

/** A₋^(−3/2) − A₊^(−3/2), written without the cancellation that the plain difference suffers near ψ = 90°. */
function ballBracket(arm: number, pair: SourcePair, cos: number): number {
  const { minus, plus } = squaredDistances(arm, pair, cos);
  const rootOfProduct = Math.sqrt(minus * plus);
  const numerator = 4 * arm * pair.orbitM * cos * (plus + rootOfProduct + minus);
  return numerator / ((Math.sqrt(plus) + Math.sqrt(minus)) * rootOfProduct ** 3);
}

interface Direction {
  sin: number;
  cos: number;
}

/** Parts of the rod's closed form; the textbook antiderivative is 0/0 at ψ = 0, this one is not. */
function beamParts(geometry: TorqueGeometry, pair: SourcePair, cos: number) {
  const half = geometry.beamHalfLengthM;
  const square = pair.orbitM * pair.orbitM + pair.offsetM * pair.offsetM;
  const sum = half * half + square;
  const product = 2 * pair.orbitM * half * cos;
  const w = Math.sqrt((sum + product) * (sum - product));
  const s = Math.sqrt(2 * (sum + w));
  const inner = w + square - half * half;
  return { w, s, inner, scale: 8 * pair.massKg * geometry.beamMassKg * half * half * pair.orbitM * pair.orbitM };
}

function beamTorque(geometry: TorqueGeometry, pair: SourcePair, { sin, cos }: Direction): number {
  const { w, s, inner, scale } = beamParts(geometry, pair, cos);
  return (scale * sin * cos) / (s * w * inner);
}

function beamGradient(geometry: TorqueGeometry, pair: SourcePair, { sin, cos }: Direction): number {
  const { w, s, inner, scale } = beamParts(geometry, pair, cos);
  const half = geometry.beamHalfLengthM;
  const wSlope = (4 * pair.orbitM * pair.orbitM * half * half * sin * cos) / w;
  const denominator = s * w * inner;
  const denominatorSlope = wSlope * ((w * inner) / s + s * (inner + w));
  return scale * ((cos * cos - sin * sin) / denominator - (sin * cos * denominatorSlope) / (denominator * denominator));
}

/** Points and weights of Gauss and Legendre on (0, 1) along half the beam, which a cylinder pulls without a closed form. */
const beamPoints = gaussLegendre(24);

/** Torque of two opposite cylinders of unit mass over G, kg/m, and its derivative by ψ: the balls as points, the beam by quadrature. */
function cylinderTorque(
  pendulum: Pendulum,
  { orbitM, pull }: { orbitM: number; pull: (squareM2: number) => Pull },
  psiRad: number,
): ValueAndSlope {
  const [sin, cos] = [Math.sin(psiRad), Math.cos(psiRad)];
  const total = { value: 0, slope: 0 };
  const add = (massKg: number, armM: number) => {
    const square = armM * armM + orbitM * orbitM;
    const product = 2 * armM * orbitM;
    const [near, far] = [pull(square - product * cos), pull(square + product * cos)];
    total.value += massKg * product * sin * (near.value - far.value);
    total.slope += massKg * product * (cos * (near.value - far.value) + product * sin * sin * (near.slope + far.slope));
  };
  add(pendulum.ballMassKg, pendulum.armM);
  for (const [x, weight] of beamPoints) add((weight * pendulum.beamMassKg) / 2, x * pendulum.beamHalfLengthM);
  return total;
}
