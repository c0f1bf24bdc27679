import { UnusableArchive } from '../archive/unusable-archive';
import { equilibriumRad } from '../physics/equilibrium';
import { inertiaKgM2 } from '../physics/oscillator';
import { geometryOf, torqueGradientPerG } from '../physics/torque';
import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import type { RigDocument } from '../rig/document';
import { ringDownSegment } from '../statistics/ring-down';
import { at } from '../statistics/symmetric';
import { isOscillation } from '../statistics/ring-down-start';
import { fitSeparable } from '../statistics/variable-projection';
import type { Analysis } from './analysis';
import { curvatureBias } from './curvature';
import type { Known } from './free-oscillator';
import { honestCovariance, type DwellFit, type FitBias } from './ring-down-fit';
import { dataOf, type Segment } from './segment';
import type { GSolution } from './solve-g';

/**
 * The time of swing: ω² differs between turntable angles by G times the difference of the torque's gradients over I, whatever the lever
 * and the scale. Each angle has a frequency of its own; the damping is common.
 */
export interface PeriodOutcome {
  solution: GSolution;
  /** Of G, from the scatter of the frequencies alone. */
  statistical: Known;
  period: Known;
  /** G of the same frequencies for a rig supposed otherwise. */
  gOf(rig: RigDocument): number;
}

/** Angles closer than this are one, deg. */
const sameAngleDeg = 0.5;
/** Gradients must move ω² by this share between two angles. */
const leastShare = 1e-5;
const rounds = 12;
const settled = 1e-9;

interface Group {
  angleDeg: number;
  segments: Segment[];
  found: DwellFit;
  omega: number;
  gamma: number;
  /** Variance of ω, and of γ. */
  variances: [number, number];
}

/** @throws UnusableArchive without two angles at which the sources stiffen the pendulum differently. */
export function periodOutcome(rig: RigDocument, { segments, found, free, system }: Analysis): PeriodOutcome {
  const groups = found === null || found.ringDown === null || system === null ? [] : groupsOf(segments, found);
  const start: GSolution = {
    bigG: CODATA_2022_G.value,
    kappa: inertiaKgM2(rig) * free.omega0Squared.value,
    omega0Squared: free.omega0Squared.value,
    gamma: free.gamma.value,
  };
  if (system === null || !differ(groups, { rig, solution: start })) {
    throw new UnusableArchive(
      { file: 'steps.csv' },
      'the method "period" needs dwells or ring-downs at two angles at which the sources stiffen the pendulum differently, 0 and 90 deg for example',
    );
  }
  let solution = start;
  let biases: (FitBias | null)[] = groups.map(() => null);
  let regressed = regress(groups, { rig, solution, biases });
  for (let round = 0; round < rounds; round += 1) {
    const before = solution.bigG;
    solution = regressed.solution;
    biases = groups.map((group, i) => {
      const shift = shiftOf(group, { rig, solution });
      const own = group.segments.map((segment) => ({ ...segment, shift }));
      return curvatureBias(own, group.found, { system, solution, shifts: own.map(() => shift), before: biases[i] ?? null });
    });
    regressed = regress(groups, { rig, solution, biases });
    if (Math.abs(regressed.solution.bigG - before) <= settled * Math.abs(before)) break;
  }
  const last = regressed.solution;
  return {
    ...regressed,
    gOf: (supposed) => {
      const ratio = last.bigG === 0 ? 0 : inertiaKgM2(supposed) / inertiaKgM2(rig);
      const near = { ...last, kappa: last.kappa * ratio };
      return regress(groups, { rig: supposed, solution: near, biases, movedFrom: rig }).solution.bigG;
    },
  };
}

function groupsOf(segments: readonly Segment[], found: DwellFit): Group[] {
  const byAngle: Segment[][] = [];
  const turned = (a: number, b: number) => Math.abs(((((a - b) % 180) + 270) % 180) - 90);
  for (const segment of segments) {
    const angle = segment.window.angleDeg ?? 0;
    const own = byAngle.find((group) => turned(group[0]?.window.angleDeg ?? 0, angle) <= sameAngleDeg);
    if (own === undefined) byAngle.push([segment]);
    else own.push(segment);
  }
  const start = found.fit.alpha as [number, number];
  return byAngle.map((own) => {
    const data = own.map((segment) => ringDownSegment({ ...dataOf(segment), shift: 0 }));
    const fit = fitSeparable(data, start, { allowed: isOscillation });
    const covariance = honestCovariance(fit).map((row) => row.map((value) => found.loosening ** 2 * value));
    return {
      angleDeg: own.reduce((sum, { window }) => sum + (window.angleDeg ?? 0), 0) / own.length,
      segments: own,
      found: { fit, bias: null, ringDown: found.ringDown, alphaCovariance: covariance, loosening: found.loosening },
      omega: fit.alpha[0] as number,
      gamma: fit.alpha[1] as number,
      variances: [at(covariance, 0, 0), at(covariance, 1, 1)],
    };
  });
}

/** Gradient of the torque over G at a group's equilibrium, kg2 m-1 rad-1. */
function gradientOf(
  { angleDeg }: Group,
  { rig, solution, movedFrom }: { rig: RigDocument; solution: GSolution; movedFrom?: RigDocument },
): number {
  const geometry = geometryOf(rig);
  const key = Object.keys(rig.stations).find((name) => Math.abs(((movedFrom ?? rig).stations[name]?.value ?? Infinity) - angleDeg) <= 1);
  const moved = key === undefined || movedFrom === undefined ? 0 : (rig.stations[key]?.value ?? 0) - (movedFrom.stations[key]?.value ?? 0);
  const phiRad = (angleDeg + moved) * RAD_PER_DEG;
  const theta = equilibriumRad({ geometry, kappa: solution.kappa, bigG: solution.bigG, phiRad });
  return torqueGradientPerG(geometry, phiRad - theta);
}

const shiftOf = (group: Group, at: { rig: RigDocument; solution: GSolution }) =>
  (at.solution.bigG * gradientOf(group, at)) / inertiaKgM2(at.rig);

function differ(groups: readonly Group[], at: { rig: RigDocument; solution: GSolution }): boolean {
  const shifts = groups.map((group) => shiftOf(group, at));
  return groups.length > 1 && Math.max(...shifts) - Math.min(...shifts) > leastShare * at.solution.omega0Squared;
}

interface RegressionInput {
  rig: RigDocument;
  solution: GSolution;
  biases: readonly (FitBias | null)[];
  movedFrom?: RigDocument;
}

/** Weighted straight line of ω₀² against the gradient: its slope is G/I, its intercept κ/I. */
function regress(groups: readonly Group[], input: RegressionInput): Omit<PeriodOutcome, 'gOf'> {
  const { rig, solution, biases } = input;
  const freeOmega = Math.sqrt(solution.omega0Squared - solution.gamma ** 2);
  const gammas = groups.map((group, i) => ({
    value: group.gamma - (biases[i]?.gamma ?? 0),
    weight: 1 / Math.max(group.variances[1], 1e-30),
  }));
  const gamma = gammas.reduce((sum, one) => sum + one.value * one.weight, 0) / gammas.reduce((sum, one) => sum + one.weight, 0);
  const points = groups.map((group, i) => {
    const omega = group.omega - ((biases[i]?.omega ?? 0) * freeOmega) / group.omega;
    return { x: gradientOf(group, input), y: omega ** 2 + gamma ** 2, variance: Math.max((2 * omega) ** 2 * group.variances[0], 1e-40) };
  });
  const total = points.reduce((sum, one) => sum + 1 / one.variance, 0);
  const mean = (key: 'x' | 'y') => points.reduce((sum, one) => sum + one[key] / one.variance, 0) / total;
  const [x, y] = [mean('x'), mean('y')];
  const spread = points.reduce((sum, one) => sum + (one.x - x) ** 2 / one.variance, 0);
  const slope = points.reduce((sum, one) => sum + ((one.x - x) * (one.y - y)) / one.variance, 0) / spread;
  const inertia = inertiaKgM2(rig);
  const omega0Squared = y - slope * x;
  const nu = Math.max(1, groups.reduce((sum, group) => sum + group.segments.length, 0) - groups.length - 1);
  const bigG = slope * inertia;
  const omega = Math.sqrt(omega0Squared - gamma * gamma);
  const omegaU = Math.sqrt(1 / total + (x * x) / spread) / (2 * omega);
  return {
    solution: { bigG, kappa: inertia * omega0Squared, omega0Squared, gamma },
    statistical: { value: bigG, u: inertia / Math.sqrt(spread), nu },
    period: { value: (2 * Math.PI) / omega, u: (2 * Math.PI * omegaU) / omega ** 2, nu },
  };
}
