import type { LimitsBody } from '@/firmware-protocol/codec';
import { homeSpeedDegS } from '@/shared/protocol/durations';
import type { RigMotion } from '@/shared/rig/document';

/** Between the rig's degrees and the controller's microsteps (SPEC 2.4). Position 0 is the home edge, at `homeDeg`. */

export function stepsOfDeg(rig: RigMotion, angleDeg: number): number {
  return Math.round((angleDeg - rig.homeDeg) * rig.stepsPerDegree) + 0;
}

export function degOfSteps(rig: RigMotion, steps: number): number {
  return rig.homeDeg + steps / rig.stepsPerDegree;
}

/** Thousandths of a microstep per s (or s²), rounded down: never above what was asked. */
export function milliStepsOf(rig: RigMotion, degrees: number): number {
  return Math.max(1, Math.floor(degrees * rig.stepsPerDegree * 1000 * (1 + 1e-12)));
}

/** The soft limits and caps that a controller on this rig has after commissioning. */
export function limitsOf(rig: RigMotion): Omit<LimitsBody, 'word'> {
  return {
    least: stepsOfDeg(rig, rig.minDeg),
    greatest: stepsOfDeg(rig, rig.maxDeg),
    speed: milliStepsOf(rig, rig.maxSpeed_deg_s),
    acceleration: milliStepsOf(rig, rig.maxAcceleration_deg_s2),
    home: milliStepsOf(rig, homeSpeedDegS(rig)),
  };
}
