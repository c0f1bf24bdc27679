import type { DwellResult } from './result';

export interface ReversalPoint {
  /** Number of the reversal in the series, from 1. */
  index: number;
  seqs: [number, number];
  /** Near minus far at this reversal, rad, freed from steady drift where a third dwell allows it. */
  rad: number;
}

/** 1 near, −1 far, 0 neither. */
function sideOf({ station }: DwellResult): -1 | 0 | 1 {
  return station.startsWith('near') ? 1 : station.startsWith('far') ? -1 : 0;
}

/**
 * Near − far of each pair of adjacent used dwells on opposite sides, for a picture of scatter and trend. Where the dwell
 * before or after stands on the first one's side its mean takes a steady drift out (the A-B-A scheme, physics of
 * weighing; *common practice, no source*). The result itself comes from the evaluation, not from here.
 */
export function reversalPoints(dwells: readonly DwellResult[]): ReversalPoint[] {
  const used = dwells.filter((dwell) => dwell.used && dwell.theta_rad !== null && sideOf(dwell) !== 0);
  const points: ReversalPoint[] = [];
  for (let i = 1; i < used.length; i += 1) {
    const a = used[i - 1] as DwellResult;
    const b = used[i] as DwellResult;
    if (sideOf(a) === sideOf(b)) continue;
    const after = used[i + 1];
    const thetaA = a.theta_rad?.value as number;
    const thetaB = b.theta_rad?.value as number;
    const closes = after && after.theta_rad && sideOf(after) === sideOf(a);
    const beside = closes ? (thetaA + (after.theta_rad?.value as number)) / 2 : thetaA;
    points.push({ index: points.length + 1, seqs: [a.seq, b.seq], rad: sideOf(b) * (thetaB - beside) });
  }
  return points;
}
