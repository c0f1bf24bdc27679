import type { Oscillator } from '../physics/oscillator';
import { cosine, offset, ringDownSegment } from '../statistics/ring-down';
import { at, bilinear, invertSymmetric, type Matrix } from '../statistics/symmetric';
import { solveAtFixedAlpha, type SegmentFit } from '../statistics/variable-projection';

/** What noise does to a recording that is fitted with a centre, a drift and ringing of an amplitude of 1 at its start. */
export interface FittedRecording {
  /** Variance of the centre with ω and γ known, times the number of readings, over that of a reading (physics.md C4). */
  inflation: number;
  /** The same where ω and γ have to come from this recording too. */
  inflationAlone: () => number;
  /** ∂centre/∂(ω, γ) */
  shift: number[];
  /** What it says about (ω, γ): their inverse covariance for a noise of 1 rad2/Hz. */
  information: Matrix;
  walk: WalkEffects;
  /** Variance of the centre by a motion whose correlation over so many seconds is given. */
  varianceBy: (correlation: (lagS: number) => number) => number;
}

/** Of a zero that gains a variance of 1 in a second. */
interface WalkEffects {
  /** What a step of the walk, at any instant of the recording, does to the centre on the average: its mean and its mean square (1/2 and 1/3 of a plain mean). */
  mean: number;
  square: number;
  /** Covariance of the centre, of which the neighbours' centres see half, with what the recording says about (ω, γ), and the covariance of the latter. */
  withPendulum: number[];
  pendulum: Matrix;
}

const readings = 240;

export function fittedRecording({ omegaD, gamma }: Oscillator, lengthS: number): FittedRecording {
  const stepS = lengthS / readings;
  const tS = Float64Array.from({ length: readings }, (_, k) => stepS * (k + 0.5));
  const segment = ringDownSegment({ tS, y: tS.map((t) => Math.exp(-gamma * t) * Math.cos(omegaD * t)) });
  const fit = solveAtFixedAlpha([segment], [omegaD, gamma]).segments[0] as SegmentFit;
  const basis = segment.basis([omegaD, gamma]);
  const centre = sumOver(basis.columns, fit.inverseNormal[offset] as number[]);
  // What a change of ω and of γ makes beyond what centre, drift and amplitudes take up.
  const beyond = [0, 1].map((parameter) => {
    const taken = sumOver(
      basis.columns,
      fit.shift.map((row) => row[parameter] as number),
    );
    const own = basis.derivatives().find((one) => one.column === cosine && one.parameter === parameter)?.values ?? taken;
    return taken.map((value, k) => value + (own[k] as number));
  }) as [Float64Array, Float64Array];
  const inflation = readings * at(fit.inverseNormal, offset, offset);
  const shift = fit.shift[offset] as number[];
  return {
    inflation,
    inflationAlone: () => inflation + readings * bilinear(shift, invertSymmetric(fit.information), shift),
    shift,
    information: fit.information.map((row) => row.map((value) => stepS * value)),
    walk: walkEffects(centre, beyond, stepS),
    varianceBy: (correlation) => {
      const lags = Float64Array.from(centre, (_, lag) => centre.reduce((sum, w, k) => sum + w * (centre[k + lag] ?? 0), 0));
      return lags.reduce((sum, product, lag) => sum + (lag === 0 ? 1 : 2) * product * correlation(lag * stepS), 0);
    },
  };
}

/** By what a step of the walk before each reading does: it moves that one and all after it. */
function walkEffects(centre: Float64Array, beyond: readonly [Float64Array, Float64Array], stepS: number): WalkEffects {
  const ofCentre = tails(centre);
  const ofPendulum = beyond.map((values) => tails(values).map((value) => stepS * value));
  const over = (f: (k: number) => number) => ofCentre.reduce((sum, _, k) => sum + f(k), 0);
  const [from, to] = [(k: number) => ofCentre[k] as number, (k: number) => ofCentre[k + 1] ?? 0];
  const said = (parameter: number, k: number) => (k === 0 ? 0 : (ofPendulum[parameter]?.[k] as number));
  return {
    mean: over((k) => from(k) + to(k)) / 2 / readings,
    square: over((k) => from(k) ** 2 + from(k) * to(k) + to(k) ** 2) / 3 / readings,
    withPendulum: [0, 1].map((i) => stepS * over((k) => said(i, k) * (from(k) - 0.5))),
    pendulum: [0, 1].map((i) => [0, 1].map((j) => stepS * over((k) => said(i, k) * said(j, k)))),
  };
}

/** Sums of the values from each to the last. */
function tails(values: Float64Array): Float64Array {
  const sums = Float64Array.from(values);
  for (let k = sums.length - 2; k >= 0; k -= 1) sums[k] = (sums[k] as number) + (sums[k + 1] as number);
  return sums;
}

const sumOver = (columns: readonly Float64Array[], factors: readonly number[]): Float64Array =>
  (columns[0] as Float64Array).map((_, k) => columns.reduce((sum, column, j) => sum + (factors[j] as number) * (column[k] as number), 0));
