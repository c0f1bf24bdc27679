import type { StepRow } from '../archive/run-records';
import type { RigDocument } from '../rig/document';

/** The turntable's angle during a run, as the step log tells it. */

interface Move {
  kind: StepRow['kind'];
  startUtcMs: number;
  endUtcMs: number;
  fromDeg: number;
  toDeg: number;
}

const moving = new Set<StepRow['kind']>(['swing', 'kick', 'rotate']);

/** The moves whose times and angles are known, in time order. */
function movesOf(steps: readonly StepRow[]): Move[] {
  return steps.flatMap(({ kind, startUtcMs, endUtcMs, angleStartDeg, angleEndDeg }) =>
    moving.has(kind) && endUtcMs !== null && angleStartDeg !== null && angleEndDeg !== null
      ? [{ kind, startUtcMs, endUtcMs, fromDeg: angleStartDeg, toDeg: angleEndDeg }]
      : [],
  );
}

/** Share of a move that is covered after the share x of its time: ramps of the length r (as a share of the time) at both ends. */
function covered(x: number, r: number): number {
  if (x <= 0) return 0;
  if (x >= 1) return 1;
  const peak = 1 / (1 - r);
  if (x < r) return (peak * x * x) / (2 * r);
  if (x > 1 - r) return 1 - (peak * (1 - x) ** 2) / (2 * r);
  return peak * (x - r / 2);
}

/**
 * Ramps of a move of known length and time at the rig's acceleration; half the time each where that would not do. Where nobody knows the
 * acceleration, a third of a swing each and nothing of a rotation.
 */
export function rampShare({ kind, startUtcMs, endUtcMs, fromDeg, toDeg }: Move, rig: RigDocument): number {
  const durationS = (endUtcMs - startUtcMs) / 1000;
  const acceleration = rig.motion?.maxAcceleration_deg_s2;
  const distance = Math.abs(toDeg - fromDeg);
  if (acceleration === undefined || !(durationS > 0)) return kind === 'rotate' ? 0 : 1 / 3;
  const root = (acceleration * durationS) ** 2 - 4 * acceleration * distance;
  if (root <= 0) return 0.5;
  const speed = (acceleration * durationS - Math.sqrt(root)) / 2;
  return Math.min(0.5, speed / acceleration / durationS);
}

export interface Turntable {
  /** Angle, rad, at an instant of the log's clock. Ask in time order for speed. */
  angleRad(utcMs: number): number;
  moves: readonly Move[];
}

/** Null without a move. */
export function turntableOf(steps: readonly StepRow[], rig: RigDocument): Turntable | null {
  const moves = movesOf(steps);
  const [first] = moves;
  if (first === undefined) return null;
  const ramps = moves.map((move) => rampShare(move, rig));
  let last = 0;
  const angleRad = (utcMs: number): number => {
    if (utcMs < (moves[last] as Move).startUtcMs) last = 0;
    while (last + 1 < moves.length && (moves[last + 1] as Move).startUtcMs <= utcMs) last += 1;
    const { startUtcMs, endUtcMs, fromDeg, toDeg } = moves[last] as Move;
    const x = endUtcMs > startUtcMs ? (utcMs - startUtcMs) / (endUtcMs - startUtcMs) : utcMs < startUtcMs ? 0 : 1;
    return ((fromDeg + (toDeg - fromDeg) * covered(x, ramps[last] as number)) * Math.PI) / 180;
  };
  return { angleRad, moves };
}
