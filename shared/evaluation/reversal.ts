import {
  abaDifference,
  countReversals,
  isAlternating,
  polynomialDifference,
  type DifferenceEstimate,
  type SidedValue,
} from '../statistics/drift';
import { walkDifference } from '../statistics/gls-drift';
import { walkScatter } from '../statistics/wandering-zero';
import { bilinear } from '../statistics/symmetric';
import { lengthS } from './dwell-windows';
import type { Segment } from './segment';
import type { Known } from './free-oscillator';
import { centreOf, type DwellFit } from './ring-down-fit';

/** Near minus far of a run's dwells, drift removed. */
export interface Reversal {
  /** Index of each member among the segments, in time order, with its weight: value = Σ weight · centre. */
  members: { segment: number; weight: number }[];
  value: number;
  /** Null where too few dwells remain to judge the scatter by. */
  known: Known | null;
  count: number;
  /** ABA was asked for and could not be used. */
  notAlternating: boolean;
}

/**
 * The difference by ABA windows or by a polynomial drift. Its uncertainty is the scatter between dwells together with what an
 * error of the shared ω and γ does to all of them alike: near and far ring in opposite senses, so that part follows the signal
 * and no scatter shows it. The scatter of many dwells tells how much of it is a zero that walks, which ABA windows take out better than
 * noise. Null without two adjacent dwells on opposite sides.
 */
export function reversalOf(
  segments: readonly Segment[],
  found: DwellFit,
  drift: { kind: 'aba' | 'polynomial' | 'gls'; order: number },
): Reversal | null {
  const indices = segments.map((_, i) => i).filter((i) => isMember(segments[i] as Segment));
  indices.sort((a, b) => middleS(segments[a] as Segment) - middleS(segments[b] as Segment));
  const centres = indices.map((i) => centreOf(found, i));
  const series = indices.map((i, k) => ({
    timeS: middleS(segments[i] as Segment),
    side: (segments[i] as Segment).window.side as 1 | -1,
    value: centres[k]?.value as number,
    lengthS: lengthS((segments[i] as Segment).window),
  }));
  const count = countReversals(series);
  if (count === 0) return null;
  const alternates = isAlternating(series);
  const estimate = differenceOf(series, drift, alternates);
  const common = [0, 1].map((j) => centres.reduce((sum, { shift }, k) => sum + (estimate.weights[k] as number) * (shift[j] as number), 0));
  const coherent = bilinear(common, found.alphaCovariance, common);
  return {
    members: indices.map((segment, k) => ({ segment, weight: estimate.weights[k] as number })),
    value: estimate.value,
    known:
      estimate.u === null
        ? null
        : { value: estimate.value, u: Math.sqrt(estimate.u ** 2 + coherent), nu: estimate.degreesOfFreedom ?? Infinity },
    count,
    notAlternating: drift.kind === 'aba' && !alternates,
  };
}

function differenceOf(series: readonly SidedValue[], drift: { kind: string; order: number }, alternates: boolean): DifferenceEstimate {
  if (drift.kind === 'gls') return walkDifference(series);
  if (drift.kind !== 'aba' || !alternates || series.length < 3) return polynomialDifference(series, drift.order);
  const windows = abaDifference(series);
  return { ...windows, ...walkScatter(series, windows.weights) };
}

/** Whether a fitted window counts in the reversal series. */
export function isMember({ window }: Segment): boolean {
  return window.row.kind === 'dwell' && window.side !== 0;
}

/** Middle of the dwell, s; the instant at which its centre is taken. */
export function middleS({ window }: Segment): number {
  const { startUtcMs, endUtcMs } = window.row;
  return (startUtcMs + (endUtcMs ?? startUtcMs)) / 2000;
}
