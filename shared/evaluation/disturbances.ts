import { factorise, applyQTransposed, sumOfSquares, type QrFactors } from '../statistics/least-squares';
import { biweight, biweightSlope, huberSlope, huberWeight, median, robustScale } from '../statistics/robust';
import { cosine, ringDownSegment, sine } from '../statistics/ring-down';
import { SingularMatrixError } from '../statistics/symmetric';
import type { DwellFit } from './ring-down-fit';
import { dataOf, type Segment } from './segment';

/** What disturbed a segment: how far each datum is trusted, and when the pendulum was knocked. */
export interface Disturbance {
  trust: Float64Array | null;
  knocksS: readonly number[];
  /** Sums over the data of trust, and of how fast a trusted residual changes with the residual. */
  sums: { trust: number; slope: number };
}

const greatestLoosening = 2;

/** How many times more the errors of the data move the fit than its weights say (Huber 1981, 6.6, from memory); 1 where all data count in full. */
export function looseningOf(disturbances: readonly Disturbance[] | null): number {
  const sum = (key: 'trust' | 'slope') => (disturbances ?? []).reduce((all, { sums }) => all + sums[key], 0);
  const [trust, slope] = [sum('trust'), sum('slope')];
  return trust === 0 ? 1 : Math.min(greatestLoosening, Math.max(1, slope > 0 ? trust / slope : greatestLoosening));
}

/** Residuals are judged only where one of them leaves the scale this far, so that an undisturbed night keeps all its data in full. */
const noticed = 6;
/** Residuals below this share of the motion are rounding, not disturbance. */
const roundingShare = 1e-7;
/** A knock must take off this many variances, and this many times what the best instant of an ordinary dwell takes off. */
const knockSignificance = 30;
const knockExcess = 20;
/** Knocks are sought at every so many boxes, and leave this share of a dwell to either side. */
const knockStride = 4;
const knockMargin = 0.08;
const mostKnocks = 2;

/**
 * Residuals by what the linear model leaves of the data beyond what it leaves of the exact equation, in units of the scale that most of
 * them have: weighed by Huber's rule first and by the biweight then, or not at all where none stands out.
 */
export function judged(segments: readonly Segment[], found: DwellFit, round: number): Disturbance[] | null {
  const excess = segments.map((segment, i) => excessOf(segment, found, i));
  const pooled = Float64Array.from(excess.flatMap((one) => [...one]));
  if (pooled.length === 0) return null;
  const scale = Math.max(robustScale(pooled), roundingShare * motionOf(segments));
  if (found.ringDown === null || !(scale > 0)) return null;
  const disturbed = round > 0 || pooled.some((value) => Math.abs(value) > noticed * scale);
  if (!disturbed) {
    const knocks = knocksOf(segments, { excess, scale, alpha: found.fit.alpha });
    return knocks.some((own) => own.length > 0) ? knocks.map((knocksS) => ({ trust: null, knocksS, sums: { trust: 0, slope: 0 } })) : null;
  }
  const weighed = excess.map((one) => trustOf(one, { scale, gently: round < 2 }));
  const trusted = segments.map((segment, i) => ({ ...segment, trust: weighed[i]?.trust as Float64Array }));
  const knocks = knocksOf(trusted, { excess, scale, alpha: found.fit.alpha }).map((own, i) =>
    own.filter((atS) => isHeld(trusted[i] as Segment, atS)),
  );
  return weighed.map((one, i) => ({ ...one, knocksS: knocks[i] as number[] }));
}

/** Trust in full that must lie to either side of a knock, in data. */
const heldBy = 6;

function isHeld({ averages: { t }, trust }: Segment, atS: number): boolean {
  const sides = [0, 0];
  t.forEach((tS, i) => (sides[tS < atS ? 0 : 1] = (sides[tS < atS ? 0 : 1] as number) + (trust?.[i] ?? 1)));
  return sides.every((sum) => sum >= heldBy);
}

/** A segment of which the biweight would leave less than this share is weighed by Huber's rule, which takes nothing away altogether. */
const leastTrust = 0.3;

function trustOf(
  excess: Float64Array,
  { scale, gently }: { scale: number; gently: boolean },
): Pick<Disturbance, 'sums'> & { trust: Float64Array } {
  const strict = excess.map((value) => biweight(value / scale));
  const kept = strict.reduce((sum, value) => sum + value, 0) / strict.length;
  const soft = gently || kept < leastTrust;
  const trust = soft ? excess.map((value) => Math.max(1e-9, huberWeight(value / scale))) : strict;
  const slopes = excess.map((value) => (soft ? huberSlope : biweightSlope)(value / scale));
  const total = (values: Float64Array) => values.reduce((sum, value) => sum + value, 0);
  return { trust, sums: { trust: total(trust), slope: total(slopes) } };
}

/** Root of the mean square of the data about their means, for one sample. */
function motionOf(segments: readonly Segment[]): number {
  const squares = segments.map(({ averages: { y, weight } }) => {
    const mean = y.reduce((sum, value) => sum + value, 0) / y.length;
    return y.reduce((sum, value, i) => sum + (weight[i] as number) * (value - mean) ** 2, 0) / y.length;
  });
  return Math.sqrt(Math.max(0, ...squares));
}

/** Data minus model, each times the root of its samples, less the same of the exact series. */
function excessOf(segment: Segment, found: DwellFit, index: number): Float64Array {
  const data = found.fit.segments[index]?.residuals ?? new Float64Array(0);
  const exact = found.bias?.residuals[index];
  return data.map((value, i) => {
    const trust = segment.trust === null ? 1 : (segment.trust[i] as number);
    const own = value - (exact?.[i] ?? 0);
    // A datum that is not trusted has no residual left in the fit; it stays out.
    return trust > 1e-6 ? own / Math.sqrt(trust) : Infinity;
  });
}

/** Where a further oscillation from some instant on explains what no drift of an ordinary dwell does. */
function knocksOf(
  segments: readonly Segment[],
  { excess, scale, alpha }: { excess: readonly Float64Array[]; scale: number; alpha: readonly number[] },
): number[][] {
  const best = segments.map((segment, i) => bestKnock(segment, excess[i] as Float64Array, alpha));
  const usual = median(best.map(({ gain }) => gain));
  return segments.map((segment, i) => {
    const { atS, gain } = best[i] as { atS: number; gain: number };
    const shows = segment.knocksS.length < mostKnocks && gain > knockSignificance * scale * scale && gain > knockExcess * usual;
    return shows ? [...segment.knocksS, atS].sort((a, b) => a - b) : [...segment.knocksS];
  });
}

function bestKnock(segment: Segment, excess: Float64Array, alpha: readonly number[]): { atS: number; gain: number } {
  const { t } = segment.averages;
  const rootTrust = excess.map((value, i) => (Number.isFinite(value) ? Math.sqrt(segment.trust?.[i] ?? 1) : 0));
  const rest = excess.map((value, i) => (Number.isFinite(value) ? value * (rootTrust[i] as number) : 0));
  const explains = knockGains(segment, { rest, rootTrust, alpha });
  const margin = Math.max(6, Math.ceil(knockMargin * t.length));
  let best = { k: -1, atS: NaN, gain: 0 };
  const tryAt = (k: number) => {
    if (k < margin || k >= t.length - margin) return;
    const atS = ((t[k - 1] as number) + (t[k] as number)) / 2;
    if (segment.knocksS.some((known) => Math.abs(known - atS) < margin * ((t[1] as number) - (t[0] as number)))) return;
    const gain = explains(k);
    if (gain > best.gain) best = { k, atS, gain };
  };
  for (let k = margin; k < t.length - margin; k += knockStride) tryAt(k);
  const coarse = best.k;
  for (let away = 1; coarse > 0 && away < knockStride; away += 1) [coarse - away, coarse + away].forEach(tryAt);
  return best;
}

interface Rest {
  rest: Float64Array;
  rootTrust: Float64Array;
  /** ω and γ of the fit. */
  alpha: readonly number[];
}

/**
 * How much more of the residuals a knock before datum k explains than the linear model with the knocks that are known, by k. The known columns
 * are factorised once; a knock adds two, which are turned with them.
 */
function knockGains(segment: Segment, { rest, rootTrust, alpha }: Rest): (k: number) => number {
  const { weight } = segment.averages;
  const root = rootTrust.map((value, i) => value * Math.sqrt(weight[i] as number));
  const columns = ringDownSegment(dataOf(segment))
    .basis(alpha)
    .columns.map((column) => column.map((value, i) => value * (root[i] as number)));
  const swinging = [cosine, sine].map((column) => Float64Array.from(columns[column] as Float64Array));
  const size = columns.length;
  const qr = factorisedOrNull(columns);
  if (qr === null) return () => 0;
  const left = Float64Array.from(rest);
  applyQTransposed(qr, left);
  const without = sumOfSquares(left.subarray(size));
  return (k) => {
    const added = swinging.map((column) => {
      const later = Float64Array.from(column).fill(0, 0, k);
      applyQTransposed(qr, later);
      return later.subarray(size);
    });
    const own = factorisedOrNull(added);
    if (own === null) return -Infinity;
    const tail = left.slice(size);
    applyQTransposed(own, tail);
    return without - sumOfSquares(tail.subarray(added.length));
  };
}

/** Null where the columns depend on each other. */
function factorisedOrNull(columns: Float64Array[]): QrFactors | null {
  try {
    return factorise(columns);
  } catch (error) {
    if (error instanceof SingularMatrixError) return null;
    throw error;
  }
}
