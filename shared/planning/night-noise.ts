import { BOLTZMANN_J_K } from '../physics/constants';
import { oscillatorOf, type Oscillator } from '../physics/oscillator';
import type { RigDocument } from '../rig/document';
import { abaDifference } from '../statistics/drift';
import { offset, ringDownSegment } from '../statistics/ring-down';
import { at, bilinear, invertSymmetric, type Matrix } from '../statistics/symmetric';
import { solveAtFixedAlpha } from '../statistics/variable-projection';
import type { Calibration } from './calibration';

/** What an alternating night of dwells leaves open by its noise (physics.md J1). */

export interface Cadence {
  /** Dwells, near and far together. */
  dwells: number;
  dwellS: number;
  /** From dwell to dwell, s. */
  cycleS: number;
  /** Ring-downs after a kick, from which the ringing of the dwells is told too, so that each has only its own amplitudes to find. */
  calibrations: readonly Calibration[];
  /** The dwells hold ringing that has to be fitted at all. */
  rings: boolean;
}

/** Samples a second, where nobody says otherwise. */
const usualRateHz = 10;
const dataPerDwell = 240;

/**
 * Variance of the fitted centre of one dwell over that of a plain mean of its samples (physics.md C4): columns for drift and ringing cost,
 * and much more so when ω and γ have to come from the same dwell.
 */
export function inflation(oscillator: Oscillator, dwellS: number, { calibrated }: { calibrated: boolean }): number {
  const fit = unitFit(oscillator, dwellS);
  const segment = fit.segments[0];
  if (segment === undefined) return Infinity;
  const known = at(segment.inverseNormal, offset, offset);
  if (calibrated) return dataPerDwell * known;
  const shift = segment.shift[offset] as number[];
  const covariance = invertSymmetric(fit.information);
  return dataPerDwell * (known + shift.reduce((sum, a, i) => sum + shift.reduce((own, b, j) => own + a * at(covariance, i, j) * b, 0), 0));
}

/** So long a recording that rings with an amplitude of 1. */
function unitFit({ omegaD, gamma }: Oscillator, lengthS: number) {
  const tS = Float64Array.from({ length: dataPerDwell }, (_, k) => (lengthS * (k + 0.5)) / dataPerDwell);
  const y = tS.map((t) => Math.exp(-gamma * t) * Math.cos(omegaD * t));
  return solveAtFixedAlpha([ringDownSegment({ tS, y })], [omegaD, gamma]);
}

/** Steady ringing at the start of a dwell when near and far alternate with a step of 1 (physics.md J2). */
function ringing({ omegaD, gamma }: Oscillator, cycleS: number): number {
  const decay = Math.exp(-gamma * cycleS);
  return 1 / Math.hypot(1 + decay * Math.cos(omegaD * cycleS), decay * Math.sin(omegaD * cycleS));
}

/** Standard uncertainty of near minus far, of which the signal (rad) is expected, rad; null where the rig has no measured pendulum. */
export function differenceU(rig: RigDocument, cadence: Cadence, signalRad: number): number | null {
  const oscillator = oscillatorOf(rig);
  if (oscillator === null || cadence.dwells < 2 || !(cadence.dwellS > 0)) return null;
  const { readout_rad: readout = 0, walk_rad_per_sqrt_min: walk = 0, temperature_K: temperature = 0 } = rig.noise ?? {};
  const { dwellS, cycleS, dwells } = cadence;
  const { inertiaKgM2, gamma, kappa } = oscillator;
  const inflated = cadence.rings ? inflation(oscillator, dwellS, { calibrated: true }) : 1;
  const white = (inflated * readout ** 2) / (usualRateHz * dwellS);
  const thermal = (8 * BOLTZMANN_J_K * temperature * inertiaKgM2 * gamma) / (kappa * kappa) / (2 * dwellS);
  const weights = weightsOf(dwells);
  const squares = weights.reduce((sum, w) => sum + w * w, 0);
  const scatter = (white + thermal) * squares + (walk ** 2 / 60) * wanderingS(weights, { dwellS, cycleS });
  return Math.sqrt(scatter + coherent(rig, cadence, { oscillator, signalRad }));
}

/**
 * What an error of ω and γ does to near minus far, as a variance: near and far ring in opposite senses, so it shifts their centres in
 * opposite senses too (physics.md C4).
 */
function coherent(rig: RigDocument, cadence: Cadence, { oscillator, signalRad }: { oscillator: Oscillator; signalRad: number }): number {
  const covariance = pendulumCovariance(rig, cadence, signalRad);
  const shift = unitFit(oscillator, cadence.dwellS).segments[0]?.shift[offset];
  if (covariance === null || shift === undefined) return 0;
  return (2 * signalRad * ringing(oscillator, cadence.cycleS)) ** 2 * bilinear(shift, covariance, shift);
}

/** What near minus far is made of, dwell by dwell: ABA windows, a plain difference of two. */
function weightsOf(dwells: number): number[] {
  const series = Array.from({ length: dwells }, (_, k) => ({ timeS: k, side: k % 2 === 0 ? (1 as const) : (-1 as const), value: 0 }));
  return dwells < 3 ? [1, -1] : abaDifference(series).weights;
}

/**
 * Variance of the weighted sum of dwell means of a random walk that gains a variance of 1 a second, s: the square of what each instant's
 * step weighs, over the night. For many dwells it comes to (3 t_c − 2 t_d)/3 over their number (physics.md J1).
 */
function wanderingS(weights: readonly number[], { dwellS, cycleS }: Pick<Cadence, 'dwellS' | 'cycleS'>): number {
  let before = weights.reduce((sum, w) => sum + w, 0);
  let variance = 0;
  for (const w of weights) {
    const after = before - w;
    variance += (dwellS * (before * before + before * after + after * after)) / 3 + (cycleS - dwellS) * after * after;
    before = after;
  }
  return variance;
}

/** No reading is quite without noise, rad2/Hz. */
const leastDensity = 1e-25;

/**
 * Covariance of ω (rad/s) and γ (1/s) as the ringing of the night itself tells them, in its dwells and after its kicks, if near minus far is
 * so many rad; null where nothing rings.
 */
export function pendulumCovariance(rig: RigDocument, cadence: Cadence, signalRad: number): Matrix | null {
  const oscillator = oscillatorOf(rig);
  if (oscillator === null || !cadence.rings || cadence.dwells < 1) return null;
  const { readout_rad: readout = 0, walk_rad_per_sqrt_min: walk = 0 } = rig.noise ?? {};
  // What a wandering zero has at the pendulum's own frequency counts as much as the readout's.
  const density = Math.max(readout ** 2 / usualRateHz + walk ** 2 / 60 / oscillator.omegaD ** 2, leastDensity);
  const inDwells = { count: cadence.dwells, lengthS: cadence.dwellS, amplitudeRad: signalRad * ringing(oscillator, cadence.cycleS) };
  const recordings = [inDwells, ...cadence.calibrations.map((one) => ({ count: 1, ...one }))];
  const parts = recordings.map(({ count, lengthS, amplitudeRad }) => ({
    information: unitFit(oscillator, lengthS).information,
    scale: (count * amplitudeRad ** 2 * lengthS) / dataPerDwell / density,
  }));
  const sum = (i: number, j: number) => parts.reduce((total, { information, scale }) => total + scale * at(information, i, j), 0);
  return invertSymmetric([0, 1].map((i) => [0, 1].map((j) => sum(i, j))));
}
