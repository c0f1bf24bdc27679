import type { StartCheck } from '@/shared/contracts/rigs';
import { formatDegrees } from '@/shared/lib/format-angle';
import { formatDuration } from '@/shared/lib/format-duration';
import type { Timeline } from '@/shared/protocol/timeline';
import { lookAtStart } from '../engine/check-at-start';
import type { RigStation } from '../interfaces/rig-stations';
import type { ControllerState, LinkHealth } from '../interfaces/turntable-link';
import type { Services } from './services';
import { check, fail, note, pass, type Outcome, type StartPlan, unanswered } from './start-check-parts';

/** What the rig itself says: its line, its inputs, where it stands and how far it may turn. */

/** Worse than this, an instant of the log could be wrong by more than the bar for clocks (5 ms at twice u). */
const worstClockUMs = 2.5;
/** The motor's heat: as long as its current is on before a dwell is worth evaluating (common practice, no source). */
const soakS = 7_200;

interface Seen {
  station: RigStation | null;
  controller: ControllerState | null;
  timeline: Timeline;
  nowUtcMs: number;
  shuffleSeed: number;
}

export function rigChecks(services: Services, plan: StartPlan, seen: Seen): StartCheck[] {
  const { station, controller, nowUtcMs } = seen;
  const health = station?.link.health() ?? null;
  return [
    check('link', 'Link to the controller', linkCheck(health, nowUtcMs)),
    check('clock', 'Clock of the controller', clockCheck(health)),
    check('homed', 'Position', homedCheck(plan, controller)),
    check('interlock', 'Interlock', inputCheck(controller?.interlockClosed, 'Closed.', 'Open: close the door of the room or the guard.')),
    check('supply', 'Motor supply', inputCheck(controller?.supplyPresent, 'Present.', 'Off: switch it on at the rig.')),
    check('still', 'Turntable', stillCheck(controller)),
    check('protocol', 'Protocol on this rig', protocolCheck(plan, seen)),
    check('travel', 'Travel', travelCheck(plan, seen)),
    check('soak', 'Heat of the motor', soakCheck(services, plan, seen)),
  ];
}

function linkCheck(health: LinkHealth | null, nowUtcMs: number): Outcome {
  if (health === null) return fail('This server does not drive the rig.');
  const { condition, detail, lastReplyUtcMs, roundTripMs } = health;
  const figures = [
    { name: 'round trip', value: roundTripMs, unit: 'ms' as const },
    { name: 'last reply', value: lastReplyUtcMs === null ? null : Math.max(0, nowUtcMs - lastReplyUtcMs) / 1000, unit: 's' as const },
  ];
  if (condition === 'ready') return pass('The controller answers.', ...figures);
  return fail(`Not ready: ${detail === '' ? `${condition}.` : detail}`, ...figures);
}

/** Times of the log are the controller's: how well they are known beside UTC. */
function clockCheck(health: LinkHealth | null): Outcome {
  const uMs = health?.clockUS == null ? null : health.clockUS * 1000;
  const figures = [
    { name: 'u of an instant', value: uMs, unit: 'ms' as const },
    { name: 'drift', value: health?.driftPpm ?? null, unit: 'ppm' as const },
  ];
  if (uMs === null) return note('Not compared with the server’s yet: the log would say so with a larger u.', ...figures);
  return uMs <= worstClockUMs
    ? pass('Compared with the server’s.', ...figures)
    : note('Known badly: the line is slow or has only just come up. Wait a few minutes.', ...figures);
}

function homedCheck({ protocol }: StartPlan, controller: ControllerState | null): Outcome {
  if (controller === null) return fail(unanswered);
  const figure = { name: 'stands at', value: controller.angleDeg, unit: 'deg' as const };
  if (controller.positionKnown)
    return pass(controller.angleDeg === null ? 'Known.' : `Known: ${formatDegrees(controller.angleDeg)}.`, figure);
  const first = protocol.steps[0]?.kind;
  return first === 'home'
    ? note('Not known; the protocol homes first.', figure)
    : fail('Not known, and the protocol does not begin with home. Put a home step first.', figure);
}

function inputCheck(good: boolean | undefined, yes: string, no: string): Outcome {
  if (good === undefined) return fail(unanswered);
  return good ? pass(yes) : fail(no);
}

function stillCheck(controller: ControllerState | null): Outcome {
  if (controller === null) return fail(unanswered);
  return controller.moving ? fail('It is moving: wait until it stands still.') : pass('Stands still.');
}

function protocolCheck(
  { protocol, document, timeZone }: StartPlan,
  { station, controller, nowUtcMs, timeline, shuffleSeed }: Seen,
): Outcome {
  const figures = [
    { name: 'steps', value: timeline.items.length, unit: '' as const },
    { name: 'dwells', value: timeline.dwells, unit: '' as const },
  ];
  const limits = station?.link.limits() ?? null;
  const { refusals, advice } = lookAtStart({ protocol, rig: document, timeZone, shuffleSeed }, { controller, limits }, nowUtcMs);
  const [first, ...others] = refusals;
  if (first === undefined && advice.length > 0) return note(advice.map(({ message }) => message).join(' '), ...figures);
  if (first === undefined) return pass('Every step can be carried out within the limits of the rig.', ...figures);
  const more = others.length === 0 ? '' : ` (and ${String(others.length)} more)`;
  return fail(`${first.path === null ? '' : `Step ${first.path}: `}${first.message}${more}`, ...figures);
}

/** How far the plan stays from the nearest end of the travel: the rig's or, where it is nearer, the controller's own. Rotations are judged with the protocol. */
function travelCheck({ document: { motion } }: StartPlan, { station, controller, timeline }: Seen): Outcome {
  if (motion === undefined) return note('The rig has no travel limits.');
  const own = station?.link.limits() ?? null;
  const [minDeg, maxDeg] = [Math.max(motion.minDeg, own?.leastDeg ?? -Infinity), Math.min(motion.maxDeg, own?.greatestDeg ?? Infinity)];
  const targets = timeline.items.flatMap(({ kind, angleToDeg }) => (kind === 'rotate' ? [] : [angleToDeg]));
  const angles = controller?.angleDeg == null ? targets : [controller.angleDeg, ...targets];
  if (angles.length === 0) return pass('Nothing turns.');
  const [least, greatest] = [Math.min(...angles), Math.max(...angles)];
  const figure = { name: 'left', value: Math.min(least - minDeg, maxDeg - greatest), unit: 'deg' as const };
  const range = `${formatDegrees(least)} to ${formatDegrees(greatest)}`;
  if (Math.min(...targets) >= minDeg && Math.max(...targets) <= maxDeg) {
    const arcs = motion.keepOut?.length ?? 0;
    return pass(
      `Turns from ${range} within ${formatDegrees(minDeg)} to ${formatDegrees(maxDeg)}; ${arcs === 0 ? 'no' : String(arcs)} keep-out arcs.`,
      figure,
    );
  }
  const narrower = own !== null && (own.leastDeg > motion.minDeg || own.greatestDeg < motion.maxDeg);
  const limits = `${formatDegrees(minDeg)} to ${formatDegrees(maxDeg)}`;
  return fail(
    narrower
      ? `Turns from ${range}, but the controller keeps within ${limits}: teach it the limits of the rig.`
      : `Turns from ${range}, beyond the limits ${limits}.`,
    figure,
  );
}

function soakCheck({ soak }: Services, { rig }: StartPlan, { controller, nowUtcMs }: Seen): Outcome {
  if (controller === null) return note(unanswered);
  soak.note(rig.id, controller, nowUtcMs);
  const sinceUtcMs = soak.sinceUtcMs(rig.id);
  const onS = sinceUtcMs === null ? 0 : (nowUtcMs - sinceUtcMs) / 1000;
  const figure = { name: 'on for', value: onS, unit: 's' as const };
  const wanted = formatDuration(soakS);
  if (sinceUtcMs === null) return note(`Off: it warms up for ${wanted} after the first motion, and the first dwells may drift.`, figure);
  if (onS < soakS) return note(`On, but not yet for ${wanted}: the first dwells may drift.`, figure);
  return pass(`On for ${wanted} or longer, as far as this server has seen.`, figure);
}
