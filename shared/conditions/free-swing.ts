import { scaleOf, toRad } from '../evaluation/channel-scale';
import { pendulumOf, standingAt } from '../protocol/predict';
import type { RigDocument } from '../rig/document';
import { boxAverage } from '../statistics/box-average';
import { cosine, offset, ringDownSegment, sine, slope, type RingDownData } from '../statistics/ring-down';
import { isOscillation } from '../statistics/ring-down-start';
import { SingularMatrixError } from '../statistics/symmetric';
import { fitSeparable, solveAtFixedAlpha, type SeparableFit } from '../statistics/variable-projection';
import type { Series } from './series';

/** The pendulum's free swing about a drifting centre, fitted to a stretch of samples while the sources stand still. */
export interface FreeSwing {
  /** Centre in the middle of the window, rad. */
  centreRad: number;
  /** rad/h */
  driftRadPerH: number;
  /** Of the oscillation at the end of the window, rad. */
  amplitudeRad: number;
  /** Root mean square of what the fit leaves of the samples, averaged over boxes of a second, times the root of their number: that of one sample, rad. */
  residualRad: number;
  /** Damped period and its standard uncertainty, s; null where the window or the ringing is too small to tell it. */
  period: { value: number; u: number } | null;
  /** Means over boxes of about a second: instant (UTC ms) and distance from the fit, rad. */
  boxes: { utcMs: Float64Array; offRad: Float64Array };
}

/** What leaves the fit by more than this has no say in it, rad: the limit at which the archive format calls a dwell not good. */
export const LEAVES_FIT_RAD = 100e-6;

const BOX_S = 1;
const MOST_BOXES = 2000;
/** A fit wants at least so many boxes, over at least so large a part of a period. */
const LEAST_BOXES = 12;
const LEAST_PERIODS = 0.4;
/** From here on a window tells the period. */
const PERIOD_PERIODS = 1.25;
/** A fitted frequency further off than this share belongs to something else. */
const MOST_OFF = 0.2;

export interface SwingWindow {
  fromUtcMs: number;
  toUtcMs: number;
  /** Where the sources stand, deg: they stiffen or soften the pendulum. */
  angleDeg: number;
}

/** Null without samples or with too few, or where the rig's pendulum is not measured. @throws UnusableArchive for a unit that is no deflection. */
export function fitFreeSwing(rig: RigDocument, series: Series | null, window: SwingWindow): FreeSwing | null {
  const pendulum = pendulumOf(rig);
  if (pendulum === null || series === null) return null;
  const { omega } = standingAt(pendulum, window.angleDeg);
  const { gamma } = pendulum.oscillator;
  const scale = scaleOf({ name: 'deflection', unit: series.unit, quantity: '', role: 'deflection' }, rig);
  const tS = series.utcMs.map((at) => (at - window.fromUtcMs) / 1000);
  const spanS = (tS.at(-1) ?? 0) - (tS[0] ?? 0);
  const boxes = boxAverage(
    tS,
    series.value.map((reading) => toRad(scale, reading)),
    Math.max(BOX_S, spanS / MOST_BOXES),
  );
  if (boxes.t.length < LEAST_BOXES || spanS < (LEAST_PERIODS * 2 * Math.PI) / omega) return null;
  const data: RingDownData = { tS: boxes.t, y: boxes.y, weight: boxes.weight, centreS: (window.toUtcMs - window.fromUtcMs) / 2000 };
  const periods = (spanS * omega) / (2 * Math.PI);
  const found = robustly(data, [omega, gamma], periods >= PERIOD_PERIODS);
  return found === null ? null : swingOf(found, data, window);
}

interface Found {
  fit: SeparableFit;
  alpha: number[];
  /** The parameters were fitted, not held. */
  free: boolean;
}

/** Twice without what left the fit before; the first time at the frequency and damping that the rig document tells. */
function robustly(data: RingDownData, alpha: number[], mayFit: boolean): Found | null {
  try {
    const first = solveAtFixedAlpha([ringDownSegment(data)], alpha);
    const kept = without(data, offsOf(data, first, alpha));
    const held = solveAtFixedAlpha([ringDownSegment(kept)], alpha);
    const again = without(data, offsOf(data, held, alpha));
    const free = mayFit ? freely(again, alpha) : null;
    return free ?? { fit: solveAtFixedAlpha([ringDownSegment(again)], alpha), alpha, free: false };
  } catch (error) {
    if (error instanceof SingularMatrixError) return null;
    throw error;
  }
}

function freely(data: RingDownData, start: number[]): Found | null {
  const near = ([omega]: readonly number[]) => Math.abs((omega as number) / (start[0] as number) - 1) < MOST_OFF;
  try {
    const fit = fitSeparable([ringDownSegment(data)], start, {
      maxIterations: 30,
      tolerance: 1e-7,
      allowed: (alpha) => isOscillation(alpha) && near(alpha),
    });
    return Number.isFinite(fit.alphaCovariance[0]?.[0] ?? Number.NaN) ? { fit, alpha: fit.alpha, free: true } : null;
  } catch (error) {
    if (error instanceof SingularMatrixError) return null;
    throw error;
  }
}

/** The model at all data, also those that had no say in the fit. */
function offsOf(data: RingDownData, fit: SeparableFit, alpha: readonly number[]): Float64Array {
  const coefficients = fit.segments[0]?.coefficients ?? new Float64Array();
  const { columns } = ringDownSegment(data).basis(alpha);
  return data.y.map((y, index) => y - columns.reduce((sum, column, j) => sum + (column[index] as number) * (coefficients[j] as number), 0));
}

/** Data further off than the limit, counted from the middle of all offs, get next to no weight; as long as enough remain. */
function without(data: RingDownData, offs: Float64Array): RingDownData {
  const sorted = Float64Array.from(offs).sort();
  const middle = sorted[sorted.length >> 1] ?? 0;
  const kept = offs.map((off) => (Math.abs(off - middle) > LEAVES_FIT_RAD ? 0 : 1));
  if (kept.reduce((sum, one) => sum + one, 0) < Math.max(LEAST_BOXES, offs.length / 2)) return data;
  const take = (values: Float64Array) => values.filter((_, index) => kept[index] === 1);
  return { ...data, tS: take(data.tS), y: take(data.y), ...(data.weight === undefined ? {} : { weight: take(data.weight) }) };
}

function swingOf({ fit, alpha, free }: Found, data: RingDownData, window: SwingWindow): FreeSwing {
  const [omega, gamma] = alpha as [number, number];
  const coefficients = fit.segments[0]?.coefficients ?? new Float64Array(4);
  const at = (index: number) => coefficients[index] as number;
  const lengthS = (window.toUtcMs - window.fromUtcMs) / 1000;
  const amplitude = Math.hypot(at(cosine), at(sine)) * Math.exp(-gamma * lengthS);
  const uOmega = Math.sqrt(fit.alphaCovariance[0]?.[0] ?? Number.NaN);
  const periodS = (2 * Math.PI) / omega;
  return {
    centreRad: at(offset),
    driftRadPerH: at(slope) * 3600,
    amplitudeRad: amplitude,
    residualRad: Math.sqrt(fit.variance),
    period: free ? { value: periodS, u: (periodS * uOmega) / omega } : null,
    boxes: { utcMs: data.tS.map((t) => window.fromUtcMs + 1000 * t), offRad: offsOf(data, fit, alpha) },
  };
}
