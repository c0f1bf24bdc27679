import { known } from './beginning';
import type { Draft } from './draft';
import type { RunContext } from './run-context';
import { noteGrave } from './halting';

/** What the controller and its line tell, written into the context and the log. Nothing is decided here. */

/** A pass of the home edge within this of where it was found proves the counted angle, deg (with the backlash). */
const EDGE_TOLERANCE_DEG = 0.02;

export function noteReady(draft: Draft): void {
  if (draft.event.type !== 'link.ready') return;
  const { context } = draft;
  const { controller } = draft.event.link;
  const { linkDownSinceUtcMs } = context;
  context.controller = known(controller);
  context.linkUp = true;
  context.linkDownSinceUtcMs = null;
  context.uPlanS = draft.stamp.uS;
  const gapS = linkDownSinceUtcMs === null ? 0 : Math.max(0, (draft.nowUtcMs - linkDownSinceUtcMs) / 1000);
  draft.log('link-ready', { bootId: controller.bootId, firmware: controller.firmware, gapS });
}

/** Whether the controller that answers has restarted since it was last heard. */
export function hasRestarted(context: RunContext, bootId: string): boolean {
  return context.controller !== null && context.controller.bootId !== bootId;
}

export function noteLost(draft: Draft): void {
  if (draft.event.type !== 'link.lost') return;
  draft.context.linkUp = false;
  draft.context.linkDownSinceUtcMs ??= draft.stamp.utcMs;
  draft.log('link-lost', { why: draft.event.link.why });
}

/** The position is gone; whatever moved is over. */
export function noteReset(draft: Draft): void {
  const { event, context } = draft;
  const bootId = event.type === 'link.reset' ? event.link.bootId : event.type === 'link.ready' ? event.link.controller.bootId : null;
  if (bootId === null) return;
  if (context.controller !== null) Object.assign(context.controller, { bootId, positionKnown: false, angleDeg: null, moving: false });
  draft.log('controller-reset', { bootId });
  noteGrave(draft, 'controller-reset');
}

export function noteInterlock(draft: Draft): void {
  if (draft.event.type !== 'link.interlock') return;
  const { closed } = draft.event.link;
  if (draft.context.controller !== null) draft.context.controller.interlockClosed = closed;
  draft.log('interlock', { closed });
  if (!closed) noteGrave(draft, 'interlock');
}

export function noteSupply(draft: Draft): void {
  if (draft.event.type !== 'link.supply') return;
  const { present } = draft.event.link;
  const { controller } = draft.context;
  if (controller !== null) controller.supplyPresent = present;
  if (controller !== null && !present) Object.assign(controller, { positionKnown: false, angleDeg: null });
  draft.log('supply', { present });
  if (!present) noteGrave(draft, 'supply');
}

export function noteArmKey(draft: Draft): void {
  if (draft.event.type === 'link.arm-key') draft.log('arm-key', { on: draft.event.link.on });
}

export function noteLease(draft: Draft): void {
  if (draft.event.type === 'link.lease-lapsed') draft.log('lease-lapsed');
}

/** Each pass of the home edge proves the counted angle, or tells by how much it is off. */
export function noteEdge(draft: Draft): void {
  if (draft.event.type !== 'link.edge') return;
  const { angleDeg, direction } = draft.event.link;
  const { homeDeg = 0, backlash_deg: backlashDeg = 0 } = draft.start.rig.motion ?? {};
  const offDeg = angleDeg - homeDeg;
  draft.log('home-edge', { angleDeg, direction, offDeg });
  const { step } = draft.context;
  if (step?.motion == null || Math.abs(offDeg) > EDGE_TOLERANCE_DEG + backlashDeg) return;
  step.row.angleSource = 'edge-verified';
  draft.saveRow(step.row);
}

export function noteStandstill(draft: Draft): void {
  if (draft.event.type !== 'link.standstill') return;
  const { angleDeg } = draft.event.link;
  if (draft.context.controller !== null) Object.assign(draft.context.controller, { moving: false, angleDeg, positionKnown: angleDeg !== null });
}

export function noteRefusal(draft: Draft): void {
  if (draft.event.type !== 'link.refused') return;
  const { commandId, code, message } = draft.event.link;
  draft.log('command-refused', { commandId, code, message });
}

/** The turntable moves and this run did not ask for it. */
export function noteStrangeMotion(draft: Draft): void {
  if (draft.event.type !== 'link.motion-began') return;
  const { commandId, angleDeg } = draft.event.link;
  draft.log('unexpected-motion', { commandId, angleDeg });
  draft.because('unexpected-motion', 'The turntable moved without a command of this run. Somebody has to look at the rig before it moves again.');
}

