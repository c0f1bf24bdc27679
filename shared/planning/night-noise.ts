import { BOLTZMANN_J_K } from '../physics/constants';
import { oscillatorOf, type Oscillator } from '../physics/oscillator';
import type { RigDocument } from '../rig/document';
import { abaDifference } from '../statistics/drift';
import { at, bilinear, invertSymmetric, type Matrix } from '../statistics/symmetric';
import type { Calibration } from './calibration';
import { fittedRecording, type FittedRecording } from './fitted-recording';

/** What an alternating night of dwells leaves open by its noise (physics.md J1). */

export interface Cadence {
  /** Dwells, near and far together. */
  dwells: number;
  dwellS: number;
  /** From dwell to dwell, s. */
  cycleS: number;
  /** Ring-downs after a kick, from which the ringing of the dwells is told too, so that each has only its own amplitudes to find. */
  calibrations: readonly Calibration[];
  /** The dwells hold ringing that tells ω and γ, and that an error of these shifts. */
  rings: boolean;
}

/** Samples a second, where nobody says otherwise. */
const usualRateHz = 10;

/** Noise of the rig's record: of a reading in rad2/Hz, and what the zero's walk gains in a second, rad2/s. */
function densities({ noise }: RigDocument): { white: number; walk: number } {
  const { readout_rad: readout = 0, walk_rad_per_sqrt_min: walk = 0 } = noise ?? {};
  return { white: readout ** 2 / usualRateHz, walk: walk ** 2 / 60 };
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
  const { white, walk } = densities(rig);
  const dwell = fittedRecording(oscillator, cadence.dwellS);
  const weights = weightsOf(cadence.dwells);
  const squares = weights.reduce((sum, w) => sum + w * w, 0);
  const own = (dwell.inflation * white) / cadence.dwellS + thermal(rig, oscillator, dwell);
  const scatter = own * squares + walk * wanderingS(weights, cadence, dwell.walk);
  return Math.sqrt(Math.max(0, scatter + (toldByRinging(rig, cadence, signalRad)?.added ?? 0)));
}

/** Variance that the air's or the fibre's heat gives the centre of a dwell, rad2 (physics.md I1). */
function thermal({ noise }: RigDocument, { kappa, omegaD, gamma }: Oscillator, { varianceBy }: FittedRecording): number {
  const { temperature_K: temperature = 0 } = noise ?? {};
  if (temperature === 0) return 0;
  const correlation = (lagS: number) => Math.exp(-gamma * lagS) * (Math.cos(omegaD * lagS) + (gamma / omegaD) * Math.sin(omegaD * lagS));
  return ((BOLTZMANN_J_K * temperature) / kappa) * varianceBy(correlation);
}

/** What near minus far is made of, dwell by dwell: ABA windows, a plain difference of two. */
function weightsOf(dwells: number): number[] {
  const series = Array.from({ length: dwells }, (_, k) => ({ timeS: k, side: k % 2 === 0 ? (1 as const) : (-1 as const), value: 0 }));
  return dwells < 3 ? [1, -1] : abaDifference(series).weights;
}

/**
 * Variance of the weighted sum of dwells of a random walk that gains a variance of 1 a second, s: the square of what each instant's
 * step weighs, over the night. For many dwells it comes to nearly (3 t_c − 2 t_d)/3 over their number (physics.md J1).
 */
function wanderingS(
  weights: readonly number[],
  { dwellS, cycleS }: Pick<Cadence, 'dwellS' | 'cycleS'>,
  { mean, square }: FittedRecording['walk'],
): number {
  let after = weights.reduce((sum, w) => sum + w, 0);
  let variance = 0;
  for (const w of weights) {
    after -= w;
    variance += dwellS * (w * w * square + 2 * w * after * mean + after * after) + (cycleS - dwellS) * after * after;
  }
  return variance;
}

/** What the ringing of the night itself tells, in its dwells and after its kicks. */
export interface ToldByRinging {
  /** Of ω (rad/s) and γ (1/s). */
  covariance: Matrix;
  /** Covariance of near minus far (rad) with ω and with γ. */
  withDifference: [number, number];
  /** What their errors add to the variance of near minus far, rad2. */
  added: number;
}

/**
 * Near and far ring in opposite senses, so an error of ω and γ shifts their centres in opposite senses too (physics.md C4); and a walk of the zero
 * within a dwell moves both its centre and what it says about ω and γ. Null where nothing rings.
 */
export function toldByRinging(rig: RigDocument, cadence: Cadence, signalRad: number): ToldByRinging | null {
  const oscillator = oscillatorOf(rig);
  if (oscillator === null || cadence.dwells < 1 || (!cadence.rings && cadence.calibrations.length === 0)) return null;
  const { white, walk } = densities(rig);
  const dwell = fittedRecording(oscillator, cadence.dwellS);
  const amplitudeRad = cadence.rings ? signalRad * ringing(oscillator, cadence.cycleS) : 0;
  const recordings = [
    { ...dwell, squares: cadence.dwells * amplitudeRad ** 2 },
    ...cadence.calibrations.map((one) => ({ ...fittedRecording(oscillator, one.lengthS), squares: one.amplitudeRad ** 2 })),
  ];
  const over = (of: (recording: FittedRecording) => Matrix) =>
    [0, 1].map((i) => [0, 1].map((j) => recordings.reduce((sum, one) => sum + one.squares * at(of(one), i, j), 0)));
  const inverse = invertSymmetric(over(({ information }) => information));
  const walked = over((one) => one.walk.pendulum);
  const covariance = inverse.map((a, i) => inverse.map((b, j) => white * at(inverse, i, j) + walk * bilinear(a, walked, b)));
  // From the place that it left the pendulum starts each dwell on the far side of the other.
  const both = -2 * amplitudeRad;
  const own = inverse.map((row) => both * walk * row.reduce((sum, one, i) => sum + one * (dwell.walk.withPendulum[i] as number), 0));
  const shift = dwell.shift.map((one) => both * one);
  const withDifference = own.map((one, j) => one + shift.reduce((sum, by, i) => sum + by * at(covariance, i, j), 0));
  return {
    covariance,
    withDifference: withDifference as [number, number],
    added: bilinear(shift, covariance, shift) + 2 * shift.reduce((sum, by, i) => sum + by * (own[i] as number), 0),
  };
}
