import type { RigDocument } from '@/shared/rig/document';

/** The optical lever as plain numbers: spot = zero + sense · distance · tan(fold · θ). */
export interface Lever {
  /** Mirror to scale, m. */
  distanceM: number;
  /** 2 where a mirror doubles the angle. */
  fold: number;
  /** +1 where the reading grows with the pendulum angle. */
  sense: 1 | -1;
  /** Reading where the beam stands at right angles to the scale, m. */
  zeroM: number;
}

/** The rig's lever; `lever.zero` counts as 0 where it is not given. Null without a lever. */
export function leverOf(rig: RigDocument): Lever | null {
  if (rig.lever === undefined) return null;
  return { distanceM: rig.lever.distance.value, fold: rig.lever.fold, sense: rig.lever.sense, zeroM: rig.lever.zero?.value ?? 0 };
}

/** Reading of the scale, m, for a pendulum angle (rad) counted from where the beam is normal to the scale. */
export function spotM(thetaRad: number, lever: Lever): number {
  return lever.zeroM + lever.sense * lever.distanceM * Math.tan(lever.fold * thetaRad);
}

/** Pendulum angle, rad, for a reading of the scale (m): the inverse of `spotM`. */
export function angleRadOfSpot(readingM: number, lever: Lever): number {
  return Math.atan((lever.sense * (readingM - lever.zeroM)) / lever.distanceM) / lever.fold;
}
