import type { GuidedView, LineMessage, LinkHealthView } from '@/shared/contracts/link';
import type { MotionLimits } from '@/shared/rig/travel';
import type { GuidedSession, Halt } from '../engine/guided-moves';
import { longestNudgeSteps } from '../engine/guided-orders';
import type { GuidedOrder } from '../engine/guided-state';
import type { RigStation } from '../interfaces/rig-stations';
import type { ControllerLimits, LinkHealth } from '../interfaces/turntable-link';
import { isoOf, isoOrNull } from './maker';
import { standingOf } from './rig-view';
import type { Services } from './services';

const healthOf = (health: LinkHealth): LinkHealthView => ({
  condition: health.condition,
  detail: health.detail,
  lastReplyAt: isoOrNull(health.lastReplyUtcMs),
  roundTripMs: health.roundTripMs,
  roundTripP50Ms: health.roundTripP50Ms,
  roundTripP95Ms: health.roundTripP95Ms,
  discardedLines: health.discardedLines,
  discardedBytes: health.discardedBytes,
  droppedByController: health.droppedByController,
  retries: health.retries,
  reconnects: health.reconnects,
  clock: health.clockOffsetMs === null || health.clockUS === null ? null : { offsetMs: health.clockOffsetMs, uMs: health.clockUS * 1000 },
  drift: health.driftPpm === null || health.driftUPpm === null ? null : { ppm: health.driftPpm, uPpm: health.driftUPpm },
  protocol: health.protocol,
  keptOutBy: health.higherEpoch,
});

export const limitsViewOf = (limits: ControllerLimits): MotionLimits => ({
  minDeg: limits.leastDeg,
  maxDeg: limits.greatestDeg,
  maxSpeed_deg_s: limits.maxSpeedDegS,
  maxAcceleration_deg_s2: limits.maxAccelerationDegS2,
  homeSpeed_deg_s: limits.homeSpeedDegS,
});

const orderViewOf = ({ sentAtUtcMs, ...order }: GuidedOrder) => ({ ...order, at: isoOf(sentAtUtcMs) });

export function guidedViewOf(services: Services, session: GuidedSession): GuidedView {
  const { guided, stations } = services;
  const { id, rig, by, sinceUtcMs, state } = session;
  const link = stations.get(rig.rigId)?.link ?? null;
  const { order, count, edges } = state;
  return {
    id,
    by,
    since: isoOf(sinceUtcMs),
    present: guided.isPresent(rig.rigId),
    whyNot: guided.whyNot(rig.rigId),
    order: order === null ? null : orderViewOf(order),
    count,
    edges,
    longestNudgeSteps: link === null ? 0 : longestNudgeSteps(rig.motion, link),
  };
}

const haltViewOf = ({ kind, by, serverAtUtcMs, confirmedAtUtcMs }: Halt) => ({
  kind,
  by,
  serverAt: isoOf(serverAtUtcMs),
  confirmedAt: isoOrNull(confirmedAtUtcMs),
});

/** The line of a rig as it is now, out of memory alone. */
export function lineOf(services: Services, { labId, rigId }: { labId: string; rigId: string }): LineMessage | null {
  const station: RigStation | null = services.stations.get(rigId);
  if (station?.labId !== labId) return null;
  const { clock, guided, supervisor } = services;
  const { link, settings } = station;
  const [session, halt, limits] = [guided.of(rigId), guided.haltOf(rigId), link.limits()];
  return {
    serverAt: isoOf(clock.utcMs()),
    beat: clock.monotonicMs(),
    link: settings,
    health: healthOf(link.health()),
    controller: link.controller(),
    limits: limits === null ? null : limitsViewOf(limits),
    ...standingOf(services, rigId),
    takenBy: supervisor.takenBy(rigId),
    guided: session === null ? null : guidedViewOf(services, session),
    halt: halt === null ? null : haltViewOf(halt),
  };
}
