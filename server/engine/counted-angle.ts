import type { RigDocument } from '@/shared/rig/document';

/** Half a step of the motor and rounding: nearer than this the sources stand where they should, deg. */
export const countingToleranceDeg = (rig: RigDocument): number => 0.51 / (rig.motion?.stepsPerDegree ?? 1) + 1e-6;

/** Standard uncertainty of a counted angle: a step and the backlash, both rectangular, deg. */
export function countedU(rig: RigDocument): number {
  const { stepsPerDegree = 1, backlash_deg: backlashDeg = 0 } = rig.motion ?? {};
  return Math.hypot(1 / stepsPerDegree, backlashDeg) / Math.sqrt(12);
}
