import type { RigDocument } from '../rig/document';
import { degrees, pathObstacles } from './motion-path';

/**
 * Homing looks for the edge of the home flag by itself, so it must be sure of the way. The flag covers the whole travel below its edge: its
 * level tells on which side the sources stand, and homing turns towards the edge from either. It cannot where the travel is a full turn or
 * more. From an unknown position homing is safe beside keep-out arcs only where the edge is in the middle, between near and far, and no arc
 * lies within the travel.
 */

/** Why a rig must not home by itself from `fromDeg` (deg; null: unknown), without a full stop; null where it may. */
export function homingObstacle(rig: RigDocument, fromDeg: number | null): string | null {
  const { motion, stations } = rig;
  if (motion === undefined) return 'the rig document has no motion section';
  const { homeDeg, minDeg, maxDeg } = motion;
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
