import type { RunStart } from '@/shared/archive/run-records';
import { excursionOf } from '@/shared/planning/excursion';
import { checkProtocol } from '@/shared/protocol/check';
import type { Finding } from '@/shared/protocol/finding';
import { planTimeline } from '@/shared/protocol/timeline';
import type { RigDocument } from '@/shared/rig/document';
import type { ControllerState } from '../interfaces/turntable-link';
import { countingToleranceDeg } from './counted-angle';

/**
 * What the protocol is refused for when it starts now, with the sources where the controller says they stand, and else what is to be told of it;
 * null: it has not answered.
 */
export function lookAtStart(
  run: Pick<RunStart, 'protocol' | 'rig' | 'timeZone' | 'shuffleSeed'>,
  controller: Pick<ControllerState, 'positionKnown' | 'angleDeg'> | null,
  utcMs: number,
): { refusals: Finding[]; advice: Finding[] } {
  const { protocol, rig, timeZone } = run;
  if (controller === null) return { refusals: checkProtocol(protocol, rig), advice: [] };
  const angleDeg = controller.positionKnown && controller.angleDeg !== null ? withinLimits(controller.angleDeg, rig) : null;
  const start = { angleDeg, utcMs, timeZone };
  const refusals = checkProtocol(protocol, rig, start);
  if (refusals.length > 0) return { refusals, advice: [] };
  return excursionOf(rig, planTimeline(run, { utcMs, angleDeg: angleDeg ?? rig.motion?.homeDeg ?? 0 }));
}

/** The refusals alone. */
export const checkAtStart = (...start: Parameters<typeof lookAtStart>): Finding[] => lookAtStart(...start).refusals;

/** A counted angle may lie half a step of the motor beyond the limit at which the sources were sent to stand. */
function withinLimits(angleDeg: number, rig: RigDocument): number {
  if (rig.motion === undefined) return angleDeg;
  const inside = Math.min(rig.motion.maxDeg, Math.max(rig.motion.minDeg, angleDeg));
  return Math.abs(inside - angleDeg) <= countingToleranceDeg(rig) ? inside : angleDeg;
}
