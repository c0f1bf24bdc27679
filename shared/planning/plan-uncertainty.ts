import { axisOffsetOf } from '../evaluation/axis-offset';
import { budgetOf, derivative, type BudgetTerm, type ObservedTerm } from '../evaluation/budget';
import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import { inertiaKgM2, oscillatorOf, type Oscillator } from '../physics/oscillator';
import { geometryOf, torquePerG } from '../physics/torque';
import type { RigDocument } from '../rig/document';
import { at } from '../statistics/symmetric';
import { differenceU, pendulumCovariance, type Cadence } from './night-noise';

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
    return u === null ? null : { signal: u, ...pendulumU(rig, cadence, { signal, periodS, decayTimeS }) };
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

/** Standard uncertainties of near minus far (rad), period and decay time (s). */
interface ObservedU {
  signal: number;
  period: number;
  decay: number;
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
  });
  const lever = rig.lever === undefined ? 0 : rig.lever.distance.u / rig.lever.distance.value;
  const parts = grouped(budget.terms).map(({ source, inputs, signed, halved }) => ({
    source,
    inputs,
    relativeU: Math.abs(signed) / bigG,
    halved: Math.abs(halved) / bigG,
  }));
  return lever > 0 ? [...parts, { source: 'lever.distance', inputs: ['lever.distance'], relativeU: lever, halved: lever / 2 }] : parts;
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

/** u of period and decay time, s, of the means weighted by u⁻². */
function pendulumU(
  rig: RigDocument,
  cadence: Cadence,
  { signal, periodS, decayTimeS }: { signal: number; periodS: number; decayTimeS: number },
): { period: number; decay: number } {
  const night = pendulumCovariance(rig, cadence, signal);
  const both = (measured: number, own: number | null) =>
    own === null ? measured : measured === 0 ? 0 : 1 / Math.hypot(1 / measured, 1 / own);
  return {
    period: both(rig.measured?.period_s?.u ?? 0, night === null ? null : (Math.sqrt(at(night, 0, 0)) * periodS ** 2) / (2 * Math.PI)),
    decay: both(rig.measured?.decayTime_s?.u ?? 0, night === null ? null : Math.sqrt(at(night, 1, 1)) * decayTimeS ** 2),
  };
}
