import type { FitCurve } from '@/shared/evaluation/result';

/** Data minus fit of each bin, rad. */
export const residualsOf = ({ dataRad, modelRad }: FitCurve): number[] => dataRad.map((y, index) => y - (modelRad[index] as number));

/** Root mean square of data minus fit, rad. */
export function residualRms(curve: FitCurve): number {
  const squares = residualsOf(curve).map((rest) => rest ** 2);
  return Math.sqrt(squares.reduce((sum, square) => sum + square, 0) / Math.max(1, squares.length));
}

export interface SharedAxes {
  /** First and last time in a dwell, s. */
  timeS: [number, number];
  /** Half of the height, rad: no residual of any dwell lies beyond it. */
  reachRad: number;
}

/** Axes on which every dwell can be compared with every other: the longest time, the greatest residual. */
export function sharedAxes(curves: readonly FitCurve[]): SharedAxes {
  const least = curves.reduce((least, { tS }) => Math.min(least, tS[0] ?? 0), 0);
  const longest = curves.reduce((most, { tS }) => Math.max(most, tS.at(-1) ?? 0), 1);
  const reach = curves.reduce((most, curve) => residualsOf(curve).reduce((own, rest) => Math.max(own, Math.abs(rest)), most), 0);
  return { timeS: [least, longest], reachRad: Math.max(1e-9, reach) };
}
