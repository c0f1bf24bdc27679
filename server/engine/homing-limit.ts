import { homeSpeedDegS } from '@/shared/protocol/durations';
import type { RigMotion } from '@/shared/rig/document';
import { freeTurns } from '@/shared/rig/travel';

/**
 * How long homing may take, ms: twice the travel of swings at home speed, to find the flag and to come back to its edge. A table that may make
 * whole turns would wind up its cables meanwhile, where the flag is broken: it takes no longer than from where it is known to stand, or else one
 * turn, of which the flag covers half.
 */
export function homingLimitMs(motion: RigMotion, knownWayMs: number | null): number {
  const msPerDeg = 1000 / homeSpeedDegS(motion);
  return freeTurns(motion) > 0 ? (knownWayMs ?? 360 * msPerDeg) : 2 * (motion.maxDeg - motion.minDeg) * msPerDeg;
}
