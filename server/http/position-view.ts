import type { PositionView } from '@/shared/contracts/position';
import type { RigDocument } from '@/shared/rig/document';
import { backlashSteps, passU, slipToleranceDeg, stepDeg } from '@/shared/rig/position-proof';
import type { KnownPosition } from '../engine/run-context';
import { isoOf, isoOrNull } from './maker';

/** The engine's book of the position for people. */
export function positionViewOf(rig: RigDocument, { proof, dwells }: KnownPosition): PositionView {
  const { proved, slip } = proof;
  const step = stepDeg(rig);
  const inDeg = (steps: number | null | undefined) => (steps == null ? null : steps * step + 0);
  const backlash = backlashSteps(proof);
  return {
    provedAt: proved === null ? null : isoOf(proved.utcMs),
    uProvedS: proved?.uS ?? null,
    direction: proved?.direction ?? null,
    offsetDeg: proved === null || slip !== null ? null : inDeg(proof[proved.direction]?.offsetSteps),
    slipDeg: inDeg(slip?.steps ?? proved?.slipSteps),
    slipSteps: slip?.steps ?? proved?.slipSteps ?? null,
    uDeg: Math.SQRT2 * passU(rig),
    // After a slip the two directions were met with two counts.
    backlashDeg: slip === null ? inDeg(backlash) : null,
    toleranceDeg: slipToleranceDeg(rig),
    dwellsSince: dwells.length,
    slippedAt: isoOrNull(slip?.utcMs ?? null),
  };
}
