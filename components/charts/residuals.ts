import type { FitCurve } from '@/shared/evaluation/result';

/** Data minus fit of each bin, rad. */
export const residualsOf = ({ dataRad, modelRad }: FitCurve): number[] => dataRad.map((y, index) => y - (modelRad[index] as number));

export interface SharedAxes {
  /** First and last time in a dwell, s. */
  timeS: [number, number];
  /** Half of the height, rad; what lies beyond it is marked at the edge. */
  reachRad: number;
}

/** The height is so many times what all but the greatest residuals of a usual dwell reach; of normal noise hardly one bin in 100 000 lies beyond. */
const room = 2;
const allBut = 0.025;
/** A side that is noisier than the other, half of the dwells, still decides. */
const quarters = 0.75;

/**
 * Axes on which every dwell can be compared with every other: the longest time, and a height that a single bin or a single dwell cannot
 * stretch until all others are flat. Where nothing stands out it is the greatest residual.
 */
export function sharedAxes(curves: readonly FitCurve[]): SharedAxes {
  const least = curves.reduce((least, { tS }) => Math.min(least, tS[0] ?? 0), 0);
  const longest = curves.reduce((most, { tS }) => Math.max(most, tS.at(-1) ?? 0), 1);
  const sizes = curves.map((curve) => residualsOf(curve).map(Math.abs).sort(upwards));
  const greatest = sizes.reduce((most, own) => Math.max(most, own.at(-1) ?? 0), 0);
  const usual = sizes.map((own) => own[Math.max(0, Math.ceil((1 - allBut) * own.length) - 1)] ?? 0).sort(upwards);
  const typical = usual[Math.floor(quarters * (usual.length - 1))] ?? 0;
  return { timeS: [least, longest], reachRad: Math.max(1e-9, typical > 0 ? Math.min(greatest, room * typical) : greatest) };
}

const upwards = (a: number, b: number) => a - b;

export interface Beyond {
  bins: number;
  /** The residual that lies farthest out, rad. */
  farthestRad: number;
}

/** What of a dwell lies beyond the shared height; null where nothing does. */
export function beyondAxes(curve: FitCurve, { reachRad }: SharedAxes): Beyond | null {
  const out = residualsOf(curve).filter((rest) => Math.abs(rest) > reachRad);
  return out.length === 0
    ? null
    : { bins: out.length, farthestRad: out.reduce((far, rest) => (Math.abs(rest) > Math.abs(far) ? rest : far)) };
}
