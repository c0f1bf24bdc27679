import type { RigDocument, RigMotion } from '../rig/document';
import { freeTurns } from '../rig/travel';
import type { Finding } from './finding';
import { degrees, pathObstacles } from './motion-path';

/**
 * Homing looks for the edge of the home flag by itself, so it must be sure of the way. The flag covers the whole travel below its edge: its
 * level tells on which side the sources stand, and homing turns towards the edge from either. It cannot where the travel is a full turn or
 * more. From an unknown position homing is safe beside keep-out arcs only where the edge is in the middle, between near and far, and no arc
 * lies within the travel. Where the table may make whole turns the flag tells nothing of them: a rotation that was broken off must not be
 * homed one turn out, for the next one would wind the cables on.
 */

/** Why a rig must not home by itself from `fromDeg` (deg; null: unknown), without a full stop; null where it may. */
export function homingObstacle(rig: RigDocument, fromDeg: number | null): string | null {
  const { motion, stations } = rig;
  if (motion === undefined) return 'the rig document has no motion section';
  const { homeDeg, minDeg, maxDeg } = motion;
  const wound = woundObstacle(motion, fromDeg);
  if (wound !== null) return wound;
  if (fromDeg === null && maxDeg - minDeg >= 360)
    return `its position is not known, and its travel from ${degrees(minDeg)} to ${degrees(maxDeg)} is a full turn or more, so the level of its home flag does not tell which way the edge lies`;
  if ((motion.keepOut ?? []).length === 0) return null;
  if (fromDeg !== null) {
    const [met] = pathObstacles(motion, fromDeg, homeDeg);
    return met === undefined ? null : `the way from ${degrees(fromDeg)} to the edge is not free: ${met.reason}`;
  }
  const { near, far } = stations;
  const between = near !== undefined && far !== undefined && (homeDeg - near.value) * (homeDeg - far.value) < 0;
  if (!between)
    return `its position is not known, it has keep-out arcs, and the edge of its home flag (motion.homeDeg ${degrees(homeDeg)}) does not lie between near and far, so homing might not turn towards the middle`;
  const [met] = pathObstacles(motion, minDeg, maxDeg);
  return met === undefined ? null : `its position is not known, and its travel is not free: ${met.reason}`;
}

/**
 * Whether the sources stand outside the travel of swings, as a rotation that was broken off leaves them; the count is good to a microstep. Half
 * a turn out they are wound whatever the rig document says meanwhile.
 */
export function isWound(motion: RigMotion, angleDeg: number): boolean {
  const toleranceDeg = 1 / motion.stepsPerDegree;
  const isOutside = angleDeg < motion.minDeg - toleranceDeg || angleDeg > motion.maxDeg + toleranceDeg;
  return isOutside && (freeTurns(motion) > 0 || Math.abs(angleDeg - motion.homeDeg) > 180);
}

function woundObstacle(motion: RigMotion, fromDeg: number | null): string | null {
  if (fromDeg === null && freeTurns(motion) > 0)
    return `its position is not known, and the home flag does not tell whether a rotation that was broken off has left its cables wound up (motion.turnsLimit ${String(motion.turnsLimit)}): look at them first`;
  return fromDeg !== null && isWound(motion, fromDeg)
    ? `it stands at ${degrees(fromDeg)}, wound up by a rotation that was broken off, and would take a turn too many for home: turn it back by nudges first`
    : null;
}

/** Nothing turns back by itself what a rotation has left wound up. */
export function woundFinding({ minDeg, maxDeg }: RigMotion, angleDeg: number): Finding {
  const outDeg = angleDeg > maxDeg ? angleDeg - maxDeg : minDeg - angleDeg;
  return {
    code: 'wound-up',
    path: null,
    message: `The sources stand at ${degrees(angleDeg)}, ${degrees(outDeg)} outside the travel ${degrees(minDeg)} to ${degrees(maxDeg)}: a rotation was broken off and its cables are wound up. Look at them, turn the table back into its travel by nudges (first move, on the link page), then start.`,
  };
}
