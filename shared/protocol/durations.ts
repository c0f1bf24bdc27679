import { trapezoid } from '../physics/trapezoid';
import type { RigDocument, RigMotion } from '../rig/document';
import type { DwellStep, SettleStep, SwingStep } from './document';
import { resolveTarget, type ResolvedTarget } from './stations';

export { nextOccurrenceUtcMs, waitUntilLocalTime } from './local-time';

/** A protocol that cannot be carried out on this rig; `check` finds all of these beforehand. */
export class UnplayableStep extends Error {
  constructor(
    readonly code:
      | 'unknown-station'
      | 'motion-missing'
      | 'period-missing'
      | 'beat-needs-swing'
      | 'shaped-impossible'
      | 'kick-too-large'
      | 'kick-impossible'
      | 'not-yet',
    message: string,
  ) {
    super(message);
  }
}

export interface SwingMove extends ResolvedTarget {
  /** deg/s */
  speedDegS: number;
  /** deg/s2 */
  accelerationDegS2: number;
  /** From rest to rest along a trapezoid of speed, s. */
  durationS: number;
}

/** The rig's motion. @throws UnplayableStep where the rig document has none. */
export function motionOf(rig: RigDocument): RigMotion {
  if (rig.motion === undefined)
    throw new UnplayableStep('motion-missing', 'The rig document has no motion section, so nothing can be moved or planned.');
  return rig.motion;
}

/**
 * The move of a plain swing from the angle `fromDeg` (deg) at the rig's greatest speed and acceleration, or at the step's own.
 * @throws UnplayableStep for a station the rig does not have, or without `motion`.
 */
export function swingMove(
  step: Pick<SwingStep, 'to' | 'speed_deg_s' | 'acceleration_deg_s2'>,
  rig: RigDocument,
  fromDeg: number,
): SwingMove {
  const motion = motionOf(rig);
  const target = resolveTarget(rig, step.to);
  if (target === null) throw new UnplayableStep('unknown-station', `The rig has no station "${String(step.to)}".`);
  const speedDegS = step.speed_deg_s ?? motion.maxSpeed_deg_s;
  const accelerationDegS2 = step.acceleration_deg_s2 ?? motion.maxAcceleration_deg_s2;
  const { durationS } = trapezoid({ fromDeg, toDeg: target.targetDeg, speedDegS, accelerationDegS2 });
  return { ...target, speedDegS, accelerationDegS2, durationS };
}

/** Home speed, deg/s: `motion.homeSpeed_deg_s`, or a tenth of the greatest speed; never above that. */
export function homeSpeedDegS(motion: RigMotion): number {
  return Math.min(motion.homeSpeed_deg_s ?? motion.maxSpeed_deg_s / 10, motion.maxSpeed_deg_s);
}

/** Before it settles on the edge the controller goes this many microsteps below it, so that the zero is always met from the same side. */
const homeClearanceSteps = 8;

/**
 * How long homing from the angle `fromDeg` (deg) takes by plan, s: to the edge of the flag at home speed, braking past it, to a place
 * below it and from there onto it, as the turntable link's specification says under Motion.
 */
export function homeDurationS(rig: RigDocument, fromDeg: number): number {
  const motion = motionOf(rig);
  const speed = homeSpeedDegS(motion);
  const acceleration = motion.maxAcceleration_deg_s2;
  const stepDeg = 1 / motion.stepsPerDegree;
  const aboveDeg = fromDeg - motion.homeDeg;
  const covered = aboveDeg < 0;
  const toEdgeDeg = covered ? -aboveDeg : aboveDeg + stepDeg;
  const speedAtEdge = Math.min(speed, Math.sqrt(2 * acceleration * toEdgeDeg));
  const rampDeg = (speed * speed) / (2 * acceleration);
  const searchS = toEdgeDeg <= rampDeg ? speedAtEdge / acceleration : toEdgeDeg / speed + speed / (2 * acceleration);
  const overshootDeg = (speedAtEdge * speedAtEdge) / (2 * acceleration);
  const stoppedDeg = covered ? overshootDeg : -(stepDeg + overshootDeg);
  const belowDeg = -(Math.abs(stoppedDeg) + homeClearanceSteps * stepDeg);
  const legS = (from: number, to: number) =>
    trapezoid({ fromDeg: from, toDeg: to, speedDegS: speed, accelerationDegS2: acceleration }).durationS;
  return searchS + speedAtEdge / acceleration + legS(stoppedDeg, belowDeg) + legS(belowDeg, 0);
}

/** The rig's damped period with the sources away, s. @throws UnplayableStep where it has not been measured. */
function periodOf(rig: RigDocument): number {
  const period = rig.measured?.period_s?.value;
  if (period === undefined) throw new UnplayableStep('period-missing', 'Lengths in periods need measured.period_s in the rig document.');
  return period;
}

export interface DwellBegin {
  startUtcMs: number;
  /** Start of the swing that the dwell directly follows; null where none does. */
  swingStartUtcMs: number | null;
}

/**
 * When a dwell ends, UTC ms. A beat counts from the start of the swing before it, so that the cadence does not depend on how
 * long the swing took; a swing longer than the beat leaves a dwell of no length.
 * @throws UnplayableStep for a length in periods on a rig without a measured period, and for a beat without a swing.
 */
export function dwellEndUtcMs(step: DwellStep, rig: RigDocument, begin: DwellBegin): number {
  if (step.for_s !== undefined) return begin.startUtcMs + step.for_s * 1000;
  if (step.periods !== undefined) return begin.startUtcMs + step.periods * periodOf(rig) * 1000;
  if (begin.swingStartUtcMs === null)
    throw new UnplayableStep('beat-needs-swing', 'A dwell with beat_periods must directly follow a swing.');
  return Math.max(begin.startUtcMs, begin.swingStartUtcMs + (step.beat_periods ?? 0) * periodOf(rig) * 1000);
}

/** When a settle of fixed length ends, UTC ms; at once for one that waits until it is calm, which has no planned length. */
export function settleEndUtcMs(step: SettleStep, startUtcMs: number): number {
  return startUtcMs + (step.for_s ?? 0) * 1000;
}
