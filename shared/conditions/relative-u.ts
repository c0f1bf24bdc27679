import { abaDifference, countReversals, isAlternating, polynomialDifference, type SidedValue } from '../statistics/drift';
import type { DwellFacts } from './dwell-verdict';

export interface ReversalSoFar {
  /** Near minus far of the good dwells, drift removed, rad. */
  differenceRad: number;
  /** Its standard uncertainty from the scatter of the dwells, over it; null while too few dwells show a scatter. */
  relativeU: number | null;
  /** Adjacent good dwells on opposite sides. */
  reversals: number;
}

/**
 * What a run has reached: u of the near−far difference so far, from the scatter of its good dwells, over the difference. By ABA windows
 * while the dwells alternate, by a straight drift where one in between was not good. An estimate on the way, cheap enough after each dwell:
 * the evaluation of the run fits all dwells together. Null before there is a reversal.
 */
export function reversalSoFar(dwells: readonly Pick<DwellFacts, 'side' | 'midUtcMs' | 'centreRad' | 'good'>[]): ReversalSoFar | null {
  const series = dwells.flatMap(({ side, midUtcMs, centreRad, good }): SidedValue[] =>
    side === null || centreRad === null || !good ? [] : [{ timeS: midUtcMs / 1000, side: side === 'near' ? 1 : -1, value: centreRad }],
  );
  const reversals = countReversals(series);
  if (reversals === 0) return null;
  const { value, u } = series.length >= 3 && isAlternating(series) ? abaDifference(series) : polynomialDifference(series, 1);
  return { differenceRad: value, relativeU: u === null || value === 0 ? null : u / Math.abs(value), reversals };
}
