import type { StartCheck } from '@/shared/contracts/rigs';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatDayAndClock } from '@/shared/lib/format-time';
import type { ProtocolDocument } from '@/shared/protocol/document';
import { planTimeline, type Timeline, type TimelineItem } from '@/shared/protocol/timeline';
import { cautionsVersion } from '@/shared/rig/cautions';
import type { RigDocument } from '@/shared/rig/document';
import { checkAtStart } from '../engine/check-at-start';
import type { RigStation } from '../interfaces/rig-stations';
import type { ControllerState } from '../interfaces/turntable-link';
import type { RigRecord } from '../store/rigs';
import { signaturesOf } from '../store/locks';
import { activeRuns, lastSampleUtcMs, type RunListRow } from '../store/runs-read';
import type { Services } from './services';

export interface StartPlan {
  rig: RigRecord;
  /** The rig document with the mass set that will be on the turntable. */
  document: RigDocument;
  protocol: ProtocolDocument;
  timeZone: string;
  /** Who would start. */
  userId: string;
}

export interface StartReport {
  checks: StartCheck[];
  mayStart: boolean;
  durationS: number;
  finishUtcMs: number;
  firstMove: string;
}

/** Deflection older than this means that nothing is arriving. */
const freshMs = 60_000;

const check = (code: string, title: string, outcome: { state: StartCheck['state']; detail: string }): StartCheck => ({
  code,
  title,
  ...outcome,
});
const pass = (detail: string) => ({ state: 'pass' as const, detail });
const fail = (detail: string) => ({ state: 'fail' as const, detail });
const unanswered = 'Not known: the controller has not answered.';
const note = (detail: string) => ({ state: 'note' as const, detail });

/** Everything that stands between a rig and a start, each with a sentence. */
export async function makeStartChecks(services: Services, plan: StartPlan): Promise<StartReport> {
  const station = services.stations.get(plan.rig.id);
  const nowUtcMs = services.clock.utcMs();
  const fromDeg = station?.link.controller()?.angleDeg ?? plan.document.motion?.homeDeg ?? 0;
  const timeline = planTimeline(
    { protocol: plan.protocol, rig: plan.document, timeZone: plan.timeZone },
    { utcMs: nowUtcMs, angleDeg: fromDeg },
  );
  const runs = await activeRuns(services.database.db, plan.rig.labId);
  const controller = station?.link.controller() ?? null;
  const checks = [
    check('link', 'Link to the controller', linkCheck(station)),
    check('homed', 'Position', homedCheck(plan, controller)),
    check(
      'interlock',
      'Interlock',
      controller === null
        ? fail(unanswered)
        : controller.interlockClosed
          ? pass('Closed.')
          : fail('Open: close the door of the room or the guard.'),
    ),
    check(
      'supply',
      'Motor supply',
      controller === null ? fail(unanswered) : controller.supplyPresent ? pass('Present.') : fail('Off: switch it on at the rig.'),
    ),
    check('still', 'Turntable', stillCheck(controller)),
    check('protocol', 'Protocol on this rig', protocolCheck(plan, controller, nowUtcMs)),
    check('data', 'Deflection', await dataCheck(services, station, nowUtcMs)),
    check('free', 'No other run', freeCheck(services, plan.rig.id, runs.get(plan.rig.id))),
    check('lock', 'Nobody at the rig', lockCheck(services, plan)),
    check('armed', 'Armed on site', armedCheck(services, plan, timeline)),
    check('cautions', 'Cautions', await cautionsCheck(services, plan)),
  ];
  return {
    checks,
    mayStart: checks.every(({ state }) => state !== 'fail'),
    durationS: timeline.durationS,
    finishUtcMs: timeline.endUtcMs,
    firstMove: firstMoveOf(timeline),
  };
}

function linkCheck(station: RigStation | null) {
  if (station === null) return fail('This server does not drive the rig.');
  const { condition, detail } = station.link.health();
  if (condition === 'ready') return pass('The controller answers.');
  return fail(`Not ready: ${detail === '' ? `${condition}.` : detail}`);
}

function stillCheck(controller: ControllerState | null) {
  if (controller === null) return fail(unanswered);
  return controller.moving ? fail('It is moving: wait until it stands still.') : pass('Stands still.');
}

function homedCheck({ protocol }: StartPlan, controller: { positionKnown: boolean; angleDeg: number | null } | null) {
  if (controller === null) return fail(unanswered);
  if (controller.positionKnown) return pass(controller.angleDeg === null ? 'Known.' : `Known: ${formatDegrees(controller.angleDeg)}.`);
  const first = protocol.steps[0]?.kind;
  return first === 'home'
    ? note('Not known; the protocol homes first.')
    : fail('Not known, and the protocol does not begin with home. Put a home step first.');
}

function protocolCheck({ protocol, document, timeZone }: StartPlan, controller: ControllerState | null, nowUtcMs: number) {
  const [first, ...others] = checkAtStart({ protocol, rig: document, timeZone }, controller, nowUtcMs);
  if (first === undefined) return pass('Every step can be carried out within the limits of the rig.');
  const more = others.length === 0 ? '' : ` (and ${String(others.length)} more)`;
  return fail(`${first.path === null ? '' : `Step ${first.path}: `}${first.message}${more}`);
}

/** A rig that fills its channel itself must be doing so; where data are brought in later nothing can be seen now. */
async function dataCheck(services: Services, station: RigStation | null, nowUtcMs: number) {
  if (station?.channel == null) return note('No deflection arrives by itself on this rig: bring the file in after the run.');
  const last = await lastSampleUtcMs(services.database, { labId: station.labId, channelId: station.channel.id });
  if (last !== null && nowUtcMs - last <= freshMs) return pass(`The channel ${station.channel.name} is being filled.`);
  return fail(
    last === null
      ? `The channel ${station.channel.name} has no sample yet.`
      : `The channel ${station.channel.name} has had no sample for ${String(Math.round((nowUtcMs - last) / 1000))} s.`,
  );
}

function freeCheck(services: Services, rigId: string, run: RunListRow | undefined) {
  const quarantined = services.supervisor.quarantinedOf(rigId);
  if (quarantined !== null) return fail(quarantined.why);
  const guidedBy = services.guided.takenBy(rigId);
  if (guidedBy !== null) return fail(guidedBy);
  return run === undefined ? pass('The rig is free.') : fail(busyWords(run));
}

/** Names the run that has the rig; there is never more than one. */
export const busyWords = (run: RunListRow): string =>
  `The run of "${run.protocolName}", revision ${String(run.protocolRevision)}, started by ${run.operator}, is ${run.state}. Wait for its end, or stop it.`;

function armedCheck(services: Services, { rig, timeZone }: StartPlan, timeline: Timeline) {
  const arm = services.arms.armOf(rig.id);
  if (arm === null) return fail(notArmed(services, rig.id));
  const until = formatDayAndClock(arm.untilUtcMs, timeZone);
  if (arm.untilUtcMs > timeline.endUtcMs) return pass(`By ${arm.name} until ${until}.`);
  return fail(
    `${arm.name} answers for it until ${until}, but the run would finish at ${formatDayAndClock(timeline.endUtcMs, timeZone)}: arm it for longer.`,
  );
}

function notArmed(services: Services, rigId: string): string {
  const ended = services.arms.endedOf(rigId);
  return `Nobody on site answers for the rig: arm it there first.${ended === null ? '' : ` The last time: ${ended.why}.`}`;
}

function lockCheck(services: Services, { rig }: StartPlan) {
  const lockedBy = services.locks.lockedBy(rig.id);
  return lockedBy === null ? pass('No personal lock is set.') : fail(lockedBy);
}

async function cautionsCheck(services: Services, { rig, userId }: StartPlan) {
  const signatures = await signaturesOf(services.database.db, { labId: rig.labId, rigId: rig.id });
  return signatures.some((each) => each.userId === userId && each.version === cautionsVersion)
    ? pass('Signed by you for this rig.')
    : fail('You have not signed the cautions for this rig in their present words: read and sign them.');
}

const moves = (item: TimelineItem) => item.kind === 'home' || item.kind === 'swing';

function firstMoveOf(timeline: Timeline): string {
  const first = timeline.items.find(moves);
  if (first === undefined) return 'nothing moves';
  if (first.kind === 'home') return 'home: find the edge of the home flag';
  const to = first.station === '' ? formatDegrees(first.angleToDeg) : `${first.station} (${formatDegrees(first.angleToDeg)})`;
  return `swing from ${formatDegrees(first.angleFromDeg)} to ${to}`;
}
