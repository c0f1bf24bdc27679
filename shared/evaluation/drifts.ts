import type { Analysis } from './analysis';
import type { DriftResult } from './result';
import { reversalOf } from './reversal';

/** Dwells for which generalised least squares are soon done; their cost grows with the cube. */
const mostForGls = 250;

/** Near minus far with the drift taken off in each way that the dwells allow; empty where there is no difference. */
export function driftsBeside({ segments, found, reversal }: Analysis, order: number): DriftResult[] {
  if (found === null || reversal === null) return [];
  const dwells = reversal.members.length;
  return (['aba', 'polynomial', 'gls'] as const).flatMap((drift): DriftResult[] => {
    if ((drift === 'aba' && dwells < 3) || (drift === 'gls' && dwells > mostForGls)) return [];
    const one = reversalOf(segments, found, { kind: drift, order });
    if (one === null || one.notAlternating) return [];
    return [{ drift, reversal_rad: { value: one.value, u: one.known?.u ?? null } }];
  });
}
