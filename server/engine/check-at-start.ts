import type { RunStart } from '@/shared/archive/run-records';
import { excursionRefusals } from '@/shared/planning/excursion';
import { checkProtocol } from '@/shared/protocol/check';
import type { Finding } from '@/shared/protocol/finding';
import { planTimeline } from '@/shared/protocol/timeline';
import type { RigDocument } from '@/shared/rig/document';
import type { ControllerState } from '../interfaces/turntable-link';
import { countingToleranceDeg } from './counted-angle';

/** What the protocol is refused for when it starts now, with the sources where the controller says they stand; null: it has not answered. */
export function checkAtStart(
  run: Pick<RunStart, 'protocol' | 'rig' | 'timeZone' | 'shuffleSeed'>,
  controller: Pick<ControllerState, 'positionKnown' | 'angleDeg'> | null,
  utcMs: number,
): Finding[] {
  const { protocol, rig, timeZone } = run;
  if (controller === null) return checkProtocol(protocol, rig);
  const angleDeg = controller.positionKnown && controller.angleDeg !== null ? withinLimits(controller.angleDeg, rig) : null;
  const start = { angleDeg, utcMs, timeZone };
  const refusals = checkProtocol(protocol, rig, start);
  if (refusals.length > 0) return refusals;
  return excursionRefusals(rig, planTimeline(run, { utcMs, angleDeg: angleDeg ?? rig.motion?.homeDeg ?? 0 }));
}

/** A counted angle may lie half a step of the motor beyond the limit at which the sources were sent to stand. */
function withinLimits(angleDeg: number, rig: RigDocument): number {
  if (rig.motion === undefined) return angleDeg;
  const inside = Math.min(rig.motion.maxDeg, Math.max(rig.motion.minDeg, angleDeg));
  return Math.abs(inside - angleDeg) <= countingToleranceDeg(rig) ? inside : angleDeg;
}
