import { relativeTorqueChange } from '../evaluation/axis-offset';
import { budgetOf, derivative, type ObservedTerm } from '../evaluation/budget';
import { CODATA_2022_G, RAD_PER_DEG } from '../physics/constants';
import { equilibriumRad } from '../physics/equilibrium';
import { inertiaKgM2, oscillatorOf } from '../physics/oscillator';
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
  const oscillator = oscillatorOf(rig);
  const [near, far] = [rig.stations.near, rig.stations.far];
  if (oscillator === null || near === undefined || far === undefined || rig.sources.shape === 'none') return null;
  const geometry = geometryOf(rig);
  const bigG = CODATA_2022_G.value;
  const restAt = (angleDeg: number) => equilibriumRad({ geometry, kappa: oscillator.kappa, bigG, phiRad: angleDeg * RAD_PER_DEG });
  const [nearRad, farRad] = [restAt(near.value), restAt(far.value)];
  const signal = nearRad - farRad;
  const u = differenceU(rig, cadence, signal);
  if (u === null) return null;
  const { periodS, decayTimeS } = oscillator;
  const gOf = (supposed: RigDocument, changes: { signal?: number; periodS?: number; decayTimeS?: number } = {}) => {
    const kappa = inertiaKgM2(supposed) * (((2 * Math.PI) / (changes.periodS ?? periodS)) ** 2 + (changes.decayTimeS ?? decayTimeS) ** -2);
    const pull = (name: 'near' | 'far', rest: number) =>
      torquePerG(geometryOf(supposed), (supposed.stations[name]?.value ?? 0) * RAD_PER_DEG - rest);
    return (kappa * (changes.signal ?? signal)) / (pull('near', nearRad) - pull('far', farRad));
  };
  const known = pendulumU(rig, cadence, { signal, periodS, decayTimeS });
  const term = (input: ObservedTerm['input'], value: number, own: { u: number; slope: number }): ObservedTerm => ({
    input,
    known: { value, u: own.u, nu: Infinity },
    sensitivity: own.slope,
  });
  const slopeBy = (key: 'signal' | 'periodS' | 'decayTimeS', value: number) =>
    derivative((step) => gOf(rig, { [key]: value + step }), 1e-4 * Math.abs(value));
  const offset = rig.axis?.offset;
  const budget = budgetOf({
    rig,
    bigG,
    gOf,
    stations: ['near', 'far'],
    lever: false,
    observed: [
      term('reversal_rad', signal, { u, slope: slopeBy('signal', signal) }),
      term('period_s', periodS, { u: known.period, slope: slopeBy('periodS', periodS) }),
      term('decayTime_s', decayTimeS, { u: known.decay, slope: slopeBy('decayTimeS', decayTimeS) }),
    ],
    axisOffset:
      offset === undefined
        ? null
        : {
            ...offset,
            relative: relativeTorqueChange(
              geometry,
              { nearRad: near.value * RAD_PER_DEG, farRad: far.value * RAD_PER_DEG },
              Math.hypot(offset.value, offset.u),
            ),
          },
  });
  const lever = rig.lever === undefined ? 0 : rig.lever.distance.u / rig.lever.distance.value;
  const bySource = Object.fromEntries(grouped(budget.terms).map(([source, signed]) => [source, Math.abs(signed) / bigG]));
  if (lever > 0) bySource['lever.distance'] = lever;
  return { bySource, relativeU: Math.hypot(...Object.values(bySource)), statistics: bySource.reversal_rad ?? 0 };
}

/** Inputs of one group share their error, so they stand together. */
function grouped(terms: readonly { line: { input: string }; signed: number; group: string | null }[]): [string, number][] {
  const sums = new Map<string, number>();
  for (const { line, signed, group } of terms) {
    const source = group === null ? line.input : `group ${group}`;
    sums.set(source, (sums.get(source) ?? 0) + signed);
  }
  return [...sums];
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
