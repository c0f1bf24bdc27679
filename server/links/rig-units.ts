import { GREATEST_POSITION, GREATEST_RATE, type Limits } from '@/firmware-protocol/codec';
import { homeSpeedDegS } from '@/shared/protocol/durations';
import type { ControllerLimits } from '../interfaces/turntable-link';
import type { RigMotion } from '@/shared/rig/document';
import { travelWithTurns } from '@/shared/rig/travel';

/** Between the rig's degrees and the controller's microsteps (SPEC 2.4). Position 0 is the home edge, at `homeDeg`. */

export function stepsOfDeg(rig: RigMotion, angleDeg: number): number {
  return bounded((angleDeg - rig.homeDeg) * rig.stepsPerDegree);
}

/** A turn, not a place: at least one microstep where it is not nothing. */
export function stepsOfTurn(rig: RigMotion, turnDeg: number): number {
  const steps = bounded(turnDeg * rig.stepsPerDegree);
  return steps === 0 ? Math.sign(turnDeg) + 0 : steps;
}

/** What lies beyond all positions is written as the furthest one: the controller refuses it by its limits. */
function bounded(steps: number): number {
  return Math.max(-GREATEST_POSITION, Math.min(GREATEST_POSITION, Math.round(steps))) + 0;
}

export function degOfSteps(rig: RigMotion, steps: number): number {
  return rig.homeDeg + steps / rig.stepsPerDegree;
}

/** Thousandths of a microstep per s (or s²), rounded down: never above what was asked. */
export function milliStepsOf(rig: RigMotion, degrees: number): number {
  return Math.max(1, Math.min(GREATEST_RATE, Math.floor(degrees * rig.stepsPerDegree * 1000 * (1 + 1e-12))));
}

/** The soft limits and caps that a controller on this rig has after commissioning: with the turns that its cables stand, for a rotation needs them. */
export function limitsOf(rig: RigMotion): Limits {
  return limitsOfDeg(rig, {
    ...travelWithTurns(rig),
    maxSpeedDegS: rig.maxSpeed_deg_s,
    maxAccelerationDegS2: rig.maxAcceleration_deg_s2,
    homeSpeedDegS: homeSpeedDegS(rig),
  });
}

/** Limits in the rig's degrees as the controller takes them. */
export function limitsOfDeg(rig: RigMotion, limits: ControllerLimits): Limits {
  return {
    least: stepsOfDeg(rig, limits.leastDeg),
    greatest: stepsOfDeg(rig, limits.greatestDeg),
    speed: milliStepsOf(rig, limits.maxSpeedDegS),
    acceleration: milliStepsOf(rig, limits.maxAccelerationDegS2),
    home: milliStepsOf(rig, limits.homeSpeedDegS),
  };
}

/** The controller's limits in the rig's degrees. */
export function degOfLimits(rig: RigMotion, { least, greatest, speed, acceleration, home }: Limits): ControllerLimits {
  const rate = (thousandths: number) => thousandths / 1000 / rig.stepsPerDegree;
  return {
    leastDeg: degOfSteps(rig, least),
    greatestDeg: degOfSteps(rig, greatest),
    maxSpeedDegS: rate(speed),
    maxAccelerationDegS2: rate(acceleration),
    homeSpeedDegS: rate(home),
  };
}
