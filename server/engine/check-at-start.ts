import type { RunStart } from '@/shared/archive/run-records';
import { excursionOf } from '@/shared/planning/excursion';
import { checkProtocol } from '@/shared/protocol/check';
import type { Finding } from '@/shared/protocol/finding';
import { degrees } from '@/shared/protocol/motion-path';
import { planTimeline, type TimelineItem } from '@/shared/protocol/timeline';
import type { RigDocument } from '@/shared/rig/document';
import { travelWithTurns } from '@/shared/rig/travel';
import type { ControllerLimits, ControllerState } from '../interfaces/turntable-link';
import { countingToleranceDeg } from './counted-angle';

/**
 * What the protocol is refused for when it starts now, with the sources where the controller says they stand, and else what is to be told of it;
 * null: it has not answered.
 */
export function lookAtStart(
  run: Pick<RunStart, 'protocol' | 'rig' | 'timeZone' | 'shuffleSeed'>,
  { controller, limits }: SeenController,
  utcMs: number,
): { refusals: Finding[]; advice: Finding[] } {
  const { protocol, rig, timeZone } = run;
  if (controller === null) return { refusals: checkProtocol(protocol, rig), advice: [] };
  const angleDeg = controller.positionKnown && controller.angleDeg !== null ? withinLimits(controller.angleDeg, rig) : null;
  const start = { angleDeg, utcMs, timeZone };
  const refusals = checkProtocol(protocol, rig, start);
  if (refusals.length > 0) return { refusals, advice: [] };
  const timeline = planTimeline(run, { utcMs, angleDeg: angleDeg ?? rig.motion?.homeDeg ?? 0 });
  const beyond = rotationsBeyond(timeline.items, rig, limits);
  return beyond.length > 0 ? { refusals: beyond, advice: [] } : excursionOf(rig, timeline);
}

/** What is seen of the controller before a start. */
interface SeenController {
  /** Null: it has not answered. */
  controller: Pick<ControllerState, 'positionKnown' | 'angleDeg'> | null;
  /** Its own limits; null: it has not told them. */
  limits: ControllerLimits | null;
}

/** One finding for each rotation of which the controller would refuse a move: it holds its own limits, whatever the rig document says. */
function rotationsBeyond(items: readonly TimelineItem[], rig: RigDocument, limits: ControllerLimits | null): Finding[] {
  const toleranceDeg = countingToleranceDeg(rig);
  const ways = new Map<string, { leastDeg: number; greatestDeg: number }>();
  for (const { kind, documentPath, angleFromDeg, angleToDeg } of items) {
    if (kind !== 'rotate') continue;
    const { leastDeg, greatestDeg } = ways.get(documentPath) ?? { leastDeg: angleFromDeg, greatestDeg: angleFromDeg };
    ways.set(documentPath, { leastDeg: Math.min(leastDeg, angleToDeg), greatestDeg: Math.max(greatestDeg, angleToDeg) });
  }
  return [...ways].flatMap(([path, { leastDeg, greatestDeg }]): Finding[] => {
    const way = `The rotation turns from ${degrees(leastDeg)} to ${degrees(greatestDeg)}`;
    if (limits === null)
      return [
        { code: 'controller-limits', path, message: `${way}, and the controller has not told its own limits yet. Wait until it has.` },
      ];
    if (leastDeg >= limits.leastDeg - toleranceDeg && greatestDeg <= limits.greatestDeg + toleranceDeg) return [];
    const own = `${degrees(limits.leastDeg)} to ${degrees(limits.greatestDeg)}`;
    const right = rig.motion === undefined ? null : travelWithTurns(rig.motion);
    const lesson = right === null ? '' : ` (${degrees(right.leastDeg)} to ${degrees(right.greatestDeg)} with its turns)`;
    return [
      {
        code: 'controller-limits',
        path,
        message: `${way}, but the controller keeps within ${own}. Write the limits of the rig${lesson} to the controller: first move, step 4, on the link page.`,
      },
    ];
  });
}

/** The refusals alone. */
export const checkAtStart = (...start: Parameters<typeof lookAtStart>): Finding[] => lookAtStart(...start).refusals;

/** A counted angle may lie half a step of the motor beyond the limit at which the sources were sent to stand. */
function withinLimits(angleDeg: number, rig: RigDocument): number {
  if (rig.motion === undefined) return angleDeg;
  const inside = Math.min(rig.motion.maxDeg, Math.max(rig.motion.minDeg, angleDeg));
  return Math.abs(inside - angleDeg) <= countingToleranceDeg(rig) ? inside : angleDeg;
}
