import { axisOffsetOf } from '../evaluation/axis-offset';
import { budgetOf, derivative, type BudgetTerm, type Correlation, type ObservedTerm } from '../evaluation/budget';
import { isCorrelation } from '../evaluation/input-words';
import type { BudgetLine } from '../evaluation/result';
import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import { inertiaKgM2, oscillatorOf, type Oscillator } from '../physics/oscillator';
import { geometryOf, torquePerG } from '../physics/torque';
import type { RigDocument } from '../rig/document';
import { at } from '../statistics/symmetric';
import { differenceU, toldByRinging, type Cadence } from './night-noise';

/** What near minus far, period and decay time leave open because the same dwells tell all three. */
export const togetherSource = 'correlation';

/** u of G after a night, by what it comes from. */
export interface PredictedU {
  /** Relative standard uncertainties of G; their root sum of squares is `relativeU`. */
  bySource: Record<string, number>;
  relativeU: number;
  /** What the dwells' noise alone leaves. */
  statistics: number;
}

/**
 * The budget that the evaluation of the night will have: geometry as documented, near minus far by the rig's noise, period and decay by
 * the mean of the measured ones and the night's own ringing. Null where the rig does not tell enough.
 */
export function predictU(rig: RigDocument, cadence: Cadence): PredictedU | null {
  const parts = documentedBudget(rig, ({ signal, oscillator: { periodS, decayTimeS } }) => {
    const u = differenceU(rig, cadence, signal);
    return u === null ? null : ofNight(rig, cadence, { signal, u, periodS, decayTimeS });
  });
  if (parts === null) return null;
  const bySource = Object.fromEntries(parts.map(({ source, relativeU }) => [source, relativeU]));
  return { bySource, relativeU: Math.hypot(...Object.values(bySource)), statistics: bySource.reversal_rad ?? 0 };
}

/** What one source leaves open in G. */
export interface BudgetPart {
  /** Input of the budget, or `group NAME`. */
  source: string;
  inputs: string[];
  /** Relative standard uncertainty of G from it, and what it would be with half its u. */
  relativeU: number;
  halved: number;
}

/** Standard uncertainties of near minus far (rad), period and decay time (s), and how they err together. */
interface ObservedU {
  signal: number;
  period: number;
  decay: number;
  correlations?: Correlation[];
}

/** The budget of G of a rig as documented, whose observation is as uncertain as said. Null where the rig does not tell enough. */
export function documentedBudget(
  rig: RigDocument,
  observedU: (night: { signal: number; oscillator: Oscillator }) => ObservedU | null,
): BudgetPart[] | null {
  const oscillator = oscillatorOf(rig);
  const [near, far] = [rig.stations.near, rig.stations.far];
  if (oscillator === null || near === undefined || far === undefined || rig.sources.shape === 'none') return null;
  const geometry = geometryOf(rig);
  const bigG = CODATA_2022_G.value;
  const restAt = (angleDeg: number) => equilibriumRad({ geometry, kappa: oscillator.kappa, bigG, phiRad: angleDeg * RAD_PER_DEG });
  const [nearRad, farRad] = [restAt(near.value), restAt(far.value)];
  const signal = nearRad - farRad;
  const known = observedU({ signal, oscillator });
  if (known === null) return null;
  const { periodS, decayTimeS } = oscillator;
  const gOf = (supposed: RigDocument, changes: { signal?: number; periodS?: number; decayTimeS?: number } = {}) => {
    const kappa = inertiaKgM2(supposed) * (((2 * Math.PI) / (changes.periodS ?? periodS)) ** 2 + (changes.decayTimeS ?? decayTimeS) ** -2);
    const pull = (name: 'near' | 'far', rest: number) =>
      torquePerG(geometryOf(supposed), (supposed.stations[name]?.value ?? 0) * RAD_PER_DEG - rest);
    return (kappa * (changes.signal ?? signal)) / (pull('near', nearRad) - pull('far', farRad));
  };
  const term = (input: ObservedTerm['input'], value: number, own: { u: number; slope: number }): ObservedTerm => ({
    input,
    known: { value, u: own.u, nu: Infinity },
    sensitivity: own.slope,
  });
  const slopeBy = (key: 'signal' | 'periodS' | 'decayTimeS', value: number) =>
    derivative((step) => gOf(rig, { [key]: value + step }), 1e-4 * Math.abs(value));
  const budget = budgetOf({
    rig,
    bigG,
    gOf,
    stations: ['near', 'far'],
    lever: false,
    observed: [
      term('reversal_rad', signal, { u: known.signal, slope: slopeBy('signal', signal) }),
      term('period_s', periodS, { u: known.period, slope: slopeBy('periodS', periodS) }),
      term('decayTime_s', decayTimeS, { u: known.decay, slope: slopeBy('decayTimeS', decayTimeS) }),
    ],
    axisOffset: axisOffsetOf(rig),
    correlations: known.correlations ?? [],
  });
  const lever = rig.lever === undefined ? 0 : rig.lever.distance.u / rig.lever.distance.value;
  const alone = grouped(budget.terms).map(({ source, inputs, signed, halved }) => ({
    source,
    inputs,
    relativeU: Math.abs(signed) / bigG,
    halved: Math.abs(halved) / bigG,
  }));
  const parts = withTogether(alone, budget.lines, bigG);
  return lever > 0 ? [...parts, { source: 'lever.distance', inputs: ['lever.distance'], relativeU: lever, halved: lever / 2 }] : parts;
}

/**
 * What erring together adds to the square of u is a part of its own; where it takes something away, the parts concerned are smaller alike, so that the
 * sum of all squares remains that of u.
 */
function withTogether(parts: BudgetPart[], lines: readonly BudgetLine[], bigG: number): BudgetPart[] {
  const added =
    lines.reduce((sum, one) => sum + (isCorrelation(one.input) ? Math.sign(one.share) * one.contribution ** 2 : 0), 0) / bigG ** 2;
  if (added === 0) return parts;
  const inputs: string[] = ['reversal_rad', 'period_s', 'decayTime_s'];
  if (added > 0) return [...parts, { source: togetherSource, inputs, relativeU: Math.sqrt(added), halved: Math.sqrt(added) / 2 }];
  const squares = parts.reduce((sum, { source, relativeU }) => sum + (inputs.includes(source) ? relativeU ** 2 : 0), 0);
  const left = Math.sqrt(Math.max(0, 1 + added / squares));
  return parts.map((one) => (inputs.includes(one.source) ? { ...one, relativeU: left * one.relativeU, halved: left * one.halved } : one));
}

/** Inputs of one group share their error, so they stand together. */
function grouped(terms: readonly BudgetTerm[]): { source: string; inputs: string[]; signed: number; halved: number }[] {
  const sums = new Map<string, { source: string; inputs: string[]; signed: number; halved: number }>();
  for (const { line, signed, slope, group } of terms) {
    const source = group === null ? line.input : `group ${group}`;
    const sum = sums.get(source) ?? { source, inputs: [], signed: 0, halved: 0 };
    // What goes with the square of u falls to a quarter.
    const square = line.input === 'axis.offset' ? signed : Math.sqrt(Math.max(0, signed ** 2 - (slope * line.u) ** 2));
    const straight = square === 0 ? signed : line.input === 'axis.offset' ? 0 : slope * line.u;
    const halved = square === 0 ? signed / 2 : Math.hypot(straight / 2, square / 4);
    sums.set(source, { source, inputs: [...sum.inputs, line.input], signed: sum.signed + signed, halved: sum.halved + halved });
  }
  return [...sums.values()];
}

interface Night {
  /** Near minus far and its u, rad. */
  signal: number;
  u: number;
  periodS: number;
  decayTimeS: number;
}

/** What a night tells: period and decay time as means, weighted by u⁻², with what was measured beforehand, which errs alone. */
function ofNight(rig: RigDocument, cadence: Cadence, { signal, u, periodS, decayTimeS }: Night): ObservedU {
  const { period_s: measuredPeriod, decayTime_s: measuredDecay } = rig.measured ?? {};
  const ringing = toldByRinging(rig, cadence, signal);
  if (ringing === null) return { signal: u, period: measuredPeriod?.u ?? 0, decay: measuredDecay?.u ?? 0 };
  const { covariance, withDifference } = ringing;
  // Both fall where ω and γ rise.
  const [byOmega, byGamma] = [-(periodS ** 2) / (2 * Math.PI), -(decayTimeS ** 2)];
  const period = meanWith(measuredPeriod?.u ?? 0, Math.sqrt(at(covariance, 0, 0)) * -byOmega);
  const decay = meanWith(measuredDecay?.u ?? 0, Math.sqrt(at(covariance, 1, 1)) * -byGamma);
  const [ofPeriod, ofDecay] = [period.share * byOmega, decay.share * byGamma];
  const coefficient = (product: number, us: number) => (us > 0 ? product / us : 0);
  return {
    signal: u,
    period: period.u,
    decay: decay.u,
    correlations: [
      { of: ['reversal_rad', 'period_s'], r: coefficient(ofPeriod * withDifference[0], u * period.u) },
      { of: ['reversal_rad', 'decayTime_s'], r: coefficient(ofDecay * withDifference[1], u * decay.u) },
      { of: ['period_s', 'decayTime_s'], r: coefficient(ofPeriod * ofDecay * at(covariance, 0, 1), period.u * decay.u) },
    ],
  };
}

/** u of the mean and the night's share in it. What was measured exactly counts alone. */
const meanWith = (measured: number, own: number): { u: number; share: number } =>
  measured === 0 ? { u: 0, share: 0 } : { u: 1 / Math.hypot(1 / measured, 1 / own), share: measured ** 2 / (measured ** 2 + own ** 2) };
