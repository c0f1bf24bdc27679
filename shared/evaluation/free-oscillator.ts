import { at } from '../statistics/symmetric';
import { weightedMean } from '../statistics/weighted-mean';
import type { RigDocument } from '../rig/document';
import type { RingDownResult } from './ring-down-fit';

/** A value with its standard uncertainty and degrees of freedom (Infinity where unknown or none are stated). */
export interface Known {
  value: number;
  u: number;
  nu: number;
}

/** The free pendulum (sources away) from the ring-down and from what was measured beforehand. */
export interface FreeOscillator {
  /** ω_d² + γ² = κ/I, rad2/s2. */
  omega0Squared: Known;
  gamma: Known;
  /** The damped period that belongs to κ, s. */
  period: Known;
  /** 1/γ, s; null where the amplitude does not fall. */
  decayTime: Known | null;
  /** Share of the ring-down in ω and in γ; the rest is the measured one's. */
  ringDownShare: { omega: number; gamma: number };
  /** |ring-down − measured| in units of their joint u; null where there is only one. */
  disagreement: { omega: number | null; gamma: number | null };
}

export interface MeasuredOscillator {
  omega: Known | null;
  gamma: Known | null;
}

/** `measured.period_s` and `measured.decayTime_s` as ω_d and γ. */
export function measuredOscillator(rig: RigDocument): MeasuredOscillator {
  const { period_s: period, decayTime_s: decay } = rig.measured ?? {};
  return {
    omega:
      period === undefined
        ? null
        : { value: (2 * Math.PI) / period.value, u: (2 * Math.PI * period.u) / period.value ** 2, nu: period.nu ?? Infinity },
    gamma: decay === undefined ? null : { value: 1 / decay.value, u: decay.u / decay.value ** 2, nu: decay.nu ?? Infinity },
  };
}

/**
 * Means weighted by u⁻² of what the ring-down and the measurement say about ω and about γ, and κ/I = ω² + γ² of these means, so that a
 * well known period counts in full beside a poorly known decay time. Null when neither says anything about the frequency.
 */
export function combine(ringDown: RingDownResult | null, measured: MeasuredOscillator): FreeOscillator | null {
  const omegas = present([ringDown === null ? null : fitted(ringDown, 0), measured.omega]);
  if (omegas.length === 0) return null;
  const gammas = present([ringDown === null ? null : fitted(ringDown, 1), measured.gamma]);
  if (gammas.length === 0) gammas.push({ value: 0, u: 0, nu: Infinity });
  const omega = meanOf(omegas);
  const gamma = meanOf(gammas);
  const ringDownShare = {
    omega: ringDown === null ? 0 : (omega.weights[0] as number),
    gamma: ringDown === null ? 0 : (gamma.weights[0] as number),
  };
  const covariance = ringDown === null ? 0 : ringDownShare.omega * ringDownShare.gamma * at(ringDown.covariance, 0, 1);
  return {
    omega0Squared: squareOf(omega.known, gamma.known, covariance),
    gamma: gamma.known,
    period: reciprocal(2 * Math.PI, omega.known),
    decayTime: gamma.known.value > 0 ? reciprocal(1, gamma.known) : null,
    ringDownShare,
    disagreement: { omega: disagreementOf(omegas), gamma: disagreementOf(gammas) },
  };
}

const present = (values: (Known | null)[]): Known[] => values.filter((one) => one !== null);

function fitted(ringDown: RingDownResult, index: 0 | 1): Known {
  return {
    value: index === 0 ? ringDown.omega : ringDown.gamma,
    u: Math.sqrt(at(ringDown.covariance, index, index)),
    nu: ringDown.degreesOfFreedom,
  };
}

/** ω² + γ²; its degrees of freedom are those of ω, which makes nearly all of it. */
function squareOf(omega: Known, gamma: Known, covariance: number): Known {
  const variance = (omega.value * omega.u) ** 2 + (gamma.value * gamma.u) ** 2 + 2 * omega.value * gamma.value * covariance;
  return { value: omega.value ** 2 + gamma.value ** 2, u: 2 * Math.sqrt(Math.max(variance, 0)), nu: omega.nu };
}

const reciprocal = (numerator: number, { value, u, nu }: Known): Known => ({
  value: numerator / value,
  u: (numerator * u) / value ** 2,
  nu,
});

function meanOf(values: readonly Known[]): { known: Known; weights: number[] } {
  const { mean, u, weights } = weightedMean(values);
  const denominator = values.reduce((sum, one, i) => sum + (one.nu === Infinity ? 0 : (weights[i] as number) ** 2 / one.nu), 0);
  return { known: { value: mean, u, nu: denominator === 0 ? Infinity : 1 / denominator }, weights };
}

function disagreementOf(values: readonly Known[]): number | null {
  const [a, b] = values;
  if (a === undefined || b === undefined) return null;
  const difference = Math.abs(a.value - b.value);
  const u = Math.hypot(a.u, b.u);
  return difference === 0 ? 0 : difference / u;
}
