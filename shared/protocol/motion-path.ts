import type { RigMotion } from '../rig/document';

/** Why a move would be refused: where it meets what. */
export interface PathObstacle {
  code: 'out-of-limits' | 'keep-out';
  /** One sentence that names the limit or the arc, without a full stop. */
  reason: string;
}

/** An angle for people: at most four decimals, a true minus sign. */
export function degrees(angleDeg: number): string {
  return `${String(Number(angleDeg.toFixed(4))).replace('-', '−')}°`;
}

/**
 * What a straight move from one absolute turntable angle (deg) to another would meet. Nothing wraps: the path is the closed interval
 * between the two. Keep-out arcs are closed as well and count every 180 deg anew, because either source meets either ball.
 */
export function pathObstacles(motion: RigMotion, fromDeg: number, toDeg: number): PathObstacle[] {
  const low = Math.min(fromDeg, toDeg);
  const high = Math.max(fromDeg, toDeg);
  const obstacles: PathObstacle[] = [];
  if (low < motion.minDeg)
    obstacles.push({ code: 'out-of-limits', reason: `${degrees(low)} lies below the limit motion.minDeg ${degrees(motion.minDeg)}` });
  if (high > motion.maxDeg)
    obstacles.push({ code: 'out-of-limits', reason: `${degrees(high)} lies above the limit motion.maxDeg ${degrees(motion.maxDeg)}` });
  for (const arc of motion.keepOut ?? []) {
    const met = imageMet(arc, low, high);
    if (met !== null) obstacles.push({ code: 'keep-out', reason: arcReason(arc, met) });
  }
  return obstacles;
}

/** Closer than this (deg) is touching: decimal fractions of a degree do not subtract exactly. */
const touchDeg = 1e-9;

/** The image of the arc, by a multiple of 180 deg, that the interval meets; the arc itself before its images. */
function imageMet([fromDeg, toDeg]: readonly [number, number], low: number, high: number): number | null {
  const first = Math.ceil((low - toDeg - touchDeg) / 180);
  const last = Math.floor((high - fromDeg + touchDeg) / 180);
  if (first > last) return null;
  if (first <= 0 && last >= 0) return 0;
  return (first > 0 ? first : last) * 180;
}

function arcReason([fromDeg, toDeg]: readonly [number, number], shiftDeg: number): string {
  const arc = `the keep-out arc ${degrees(fromDeg)} to ${degrees(toDeg)}`;
  if (shiftDeg === 0) return `it meets ${arc}`;
  return `it meets ${arc} in its image ${degrees(fromDeg + shiftDeg)} to ${degrees(toDeg + shiftDeg)}, where the other source meets the ball`;
}
