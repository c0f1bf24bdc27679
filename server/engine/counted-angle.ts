import type { RigDocument } from '@/shared/rig/document';

/** Half a step of the motor and rounding: nearer than this the sources stand where they should, deg. */
export const countingToleranceDeg = (rig: RigDocument): number => 0.51 / (rig.motion?.stepsPerDegree ?? 1) + 1e-6;
