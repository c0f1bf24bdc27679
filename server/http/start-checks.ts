import type { StartCheck } from '@/shared/contracts/rigs';
import { formatDegrees } from '@/shared/lib/format-angle';
import { planTimeline, type Timeline, type TimelineItem } from '@/shared/protocol/timeline';
import type { Services } from './services';
import { labChecks } from './start-checks-lab';
import { nightChecks } from './start-checks-night';
import { rigChecks } from './start-checks-rig';
import type { StartPlan } from './start-check-parts';

export interface StartReport {
  checks: StartCheck[];
  mayStart: boolean;
  durationS: number;
  finishUtcMs: number;
  firstMove: string;
  /** What the order of shuffled repeats was drawn from: a start that follows begins with it. */
  shuffleSeed: number;
}

/** Everything that stands between a rig and a start, each with a sentence and its present figures. */
export async function makeStartChecks(services: Services, plan: StartPlan): Promise<StartReport> {
  const station = services.stations.get(plan.rig.id);
  const controller = station?.link.controller() ?? null;
  const nowUtcMs = services.clock.utcMs();
  const shuffleSeed = services.startSeeds.of(plan.rig.id);
  const timeline = planTimeline(
    { protocol: plan.protocol, rig: plan.document, timeZone: plan.timeZone, shuffleSeed },
    { utcMs: nowUtcMs, angleDeg: controller?.angleDeg ?? plan.document.motion?.homeDeg ?? 0 },
  );
  const checks = [
    ...rigChecks(services, plan, { station, controller, timeline, nowUtcMs, shuffleSeed }),
    ...(await labChecks(services, plan, { station, timeline, nowUtcMs })),
    ...(await nightChecks(services, plan, timeline)),
  ];
  return {
    checks,
    mayStart: checks.every(({ state }) => state !== 'fail'),
    durationS: timeline.durationS,
    finishUtcMs: timeline.endUtcMs,
    firstMove: firstMoveOf(timeline),
    shuffleSeed,
  };
}

const moves = (item: TimelineItem) => ['home', 'swing', 'kick', 'rotate'].includes(item.kind);

function firstMoveOf(timeline: Timeline): string {
  const first = timeline.items.find(moves);
  if (first === undefined) return 'nothing moves';
  if (first.kind === 'home') return 'home: find the edge of the home flag';
  const to = first.station === '' ? formatDegrees(first.angleToDeg) : `${first.station} (${formatDegrees(first.angleToDeg)})`;
  return `${first.kind} from ${formatDegrees(first.angleFromDeg)} to ${to}`;
}
