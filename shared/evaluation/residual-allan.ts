import { deviationSums, whiteVariance, type DeviationKind } from '../statistics/allan';
import type { FitCurve } from './result';

export interface ResidualAllanPoint {
  tauS: number;
  /** Deviation with its standard uncertainty, rad. */
  deviationRad: number;
  u: number;
  /** What white noise as great as at the shortest time would have here, rad. */
  whiteRad: number;
}

/** A step longer than this many usual ones is a gap. */
const gapFactor = 1.5;
/** Second differences needed for a point. */
const fewest = 4;

/**
 * Deviation (NIST SP 1065, 5.2) of what the fits leave of the data, the squares of all dwells pooled; averaging times of 1, 2, 4, … bins. Its u is that
 * of white noise. A fit takes slow parts out, so at a good part of a dwell's length the deviation lies below that of the readings.
 */
export function residualAllan(curves: readonly FitCurve[], kind: DeviationKind = 'allan'): ResidualAllanPoint[] {
  const widthS = usualStep(curves);
  const series = widthS === null ? [] : curves.flatMap((curve) => unbroken(curve, widthS));
  const longest = Math.max(0, ...series.map(({ length }) => length));
  const points: ResidualAllanPoint[] = [];
  for (let m = 1; 2 * m < longest; m *= 2) {
    const sums = series.filter(({ length }) => length >= 2 * m).map((values) => deviationSums(values, m, kind));
    const count = sums.reduce((all, one) => all + one.count, 0);
    if (count < fewest) break;
    const deviationRad = Math.sqrt(sums.reduce((all, { sum }) => all + sum, 0) / count);
    const freedom = sums.reduce((all, one) => all + one.freedom, 0);
    const first = points[0]?.deviationRad ?? deviationRad;
    points.push({
      tauS: m * (widthS ?? 0),
      deviationRad,
      u: deviationRad / Math.sqrt(2 * Math.max(1, freedom)),
      whiteRad: first * Math.sqrt(whiteVariance(m, kind) / whiteVariance(1, kind)),
    });
  }
  return points;
}

function usualStep(curves: readonly FitCurve[]): number | null {
  const steps = curves.flatMap(({ tS }) => tS.slice(1).map((t, i) => t - (tS[i] as number))).sort((a, b) => a - b);
  return steps[steps.length >> 1] ?? null;
}

/** Residuals of a dwell, cut where bins are missing. */
function unbroken({ tS, dataRad, modelRad }: FitCurve, widthS: number): number[][] {
  const pieces: number[][] = [];
  tS.forEach((t, i) => {
    const rest = (dataRad[i] as number) - (modelRad[i] as number);
    if (i === 0 || t - (tS[i - 1] as number) > gapFactor * widthS) pieces.push([rest]);
    else pieces.at(-1)?.push(rest);
  });
  return pieces;
}

/** Up to which averaging time the deviation falls as that of white noise, within 2 u, and how it departs then. */
export function whiteUntil(points: readonly ResidualAllanPoint[]): { untilS: number; departs: 'above' | 'below' | null } | null {
  if (points.length < 3) return null;
  const at = points.findIndex(
    ({ deviationRad, u, whiteRad }, i) => i > 0 && Math.abs(deviationRad - whiteRad) > 2 * Math.hypot(u, points[0]?.u ?? 0),
  );
  const last = points[at === -1 ? points.length - 1 : at - 1];
  const first = points[at];
  if (last === undefined) return null;
  return { untilS: last.tauS, departs: first === undefined ? null : first.deviationRad > first.whiteRad ? 'above' : 'below' };
}
