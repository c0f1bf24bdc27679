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
import { at, bilinear } from '../statistics/symmetric';
import { lengthS } from './dwell-windows';
import type { Segment } from './segment';
import type { Known } from './free-oscillator';
import { centreOf, ownSteps, type DwellFit } from './ring-down-fit';

/** Near minus far of a run's dwells, drift removed. */
export interface Reversal {
  /** Index of each member among the segments, in time order, with its weight: value = Σ weight · centre. */
  members: { segment: number; weight: number }[];
  value: number;
  /** Null where too few dwells remain to judge the scatter by. */
  known: Known | null;
  /** Covariance with the ω (rad/s) and the γ (1/s) of the ring-down; null where that told neither. */
  withRingDown: [number, number] | null;
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
    withRingDown: found.ringDown === null ? null : covarianceWith(found, { series, indices, ...estimate }, common),
    count,
    notAlternating: drift.kind === 'aba' && !alternates,
  };
}

/** From so many dwells on they show by themselves how centre and period err together. */
const enoughTogether = 8;

/**
 * How the difference errs together with ω and γ, which the same dwells tell: by the centres, which were fitted with them, and by what moves
 * both within a dwell, as a zero that walks does. The latter from each dwell's own departure from its neighbours and its own say about ω and γ.
 */
function covarianceWith(
  found: DwellFit,
  {
    series,
    indices,
    weights,
    value,
  }: { series: readonly SidedValue[]; indices: readonly number[]; weights: readonly number[]; value: number },
  common: readonly number[],
): [number, number] {
  const coherent = [0, 1].map((j) => common.reduce((sum, one, i) => sum + one * at(found.alphaCovariance, i, j), 0));
  const own = [0, 0];
  if (series.length >= enoughTogether) {
    const steps = ownSteps(found.fit);
    const free = series.map((one) => ({ atS: one.timeS, rad: one.value - (one.side * value) / 2 }));
    free.forEach(({ atS, rad }, k) => {
      const [before, after] = [free[k - 1], free[k + 1]];
      const expected =
        before === undefined || after === undefined
          ? ((before ?? after)?.rad ?? rad)
          : before.rad + ((after.rad - before.rad) * (atS - before.atS)) / (after.atS - before.atS);
      const step = steps[indices[k] as number] as number[];
      for (const j of [0, 1])
        own[j] = (own[j] as number) + (weights[k] as number) * (rad - expected) * found.loosening * (step[j] as number);
    });
  }
  return [(coherent[0] as number) + (own[0] as number), (coherent[1] as number) + (own[1] as number)];
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
